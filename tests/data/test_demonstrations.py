"""The demonstrations in data/ are what their script makes, byte by byte."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest

from workbench.evidence.weigh import weigh
from workbench.hypotheses.file.reading import read_analysis

DATA = Path(__file__).parents[2] / "data"
MADE = (
    "skerry/skerry-peak.csv",
    "skerry/skerry-fixed-mass.toml",
    "skerry/counts.csv",
    "tarn/tarn-line.csv",
    "tarn/tarn-sideband.csv",
    "sorrel/sorrel-signal.csv",
    "sorrel/sorrel-control.csv",
    "marram/marram-showers.csv",
    "dunlin/dunlin-pairs.csv",
    "brough/brough-captures.csv",
)


@pytest.fixture(scope="module")
def remade(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("data")
    subprocess.run([sys.executable, DATA / "make.py", folder], check=True)
    return folder


@pytest.mark.parametrize("name", MADE)
def test_the_script_makes_the_same_bytes_again(remade: Path, name: str) -> None:
    assert (remade / name).read_bytes() == (DATA / name).read_bytes()


def test_the_script_makes_nothing_else(remade: Path) -> None:
    made = {path.relative_to(remade).as_posix() for path in remade.rglob("*") if path.is_file()}
    assert made == set(MADE)


def test_every_table_in_the_folders_is_made_by_the_script() -> None:
    tables = {path.relative_to(DATA).as_posix() for path in DATA.rglob("*.csv")}
    assert tables == {name for name in MADE if name.endswith(".csv")}


@pytest.mark.parametrize("folder", ["skerry", "tarn", "sorrel", "marram", "dunlin", "brough"])
def test_the_truth_is_told_only_at_the_end_of_the_readme(folder: str) -> None:
    text = (DATA / folder / "README.md").read_text(encoding="utf-8")
    before, after = text.split("\n## The truth behind it\n")
    assert "seed" in before
    assert "\n## " not in after


@pytest.mark.parametrize(
    "name", ["skerry/skerry-fixed-mass", "tarn/tarn", "sorrel/sorrel", "marram/marram", "dunlin/dunlin"]
)
def test_a_demonstration_has_an_established_answer(name: str) -> None:
    weighing = weigh(read_analysis(DATA / f"{name}.toml"))
    assert weighing.established, weighing.evidences
    assert all(comparison.posterior_odds is not None for comparison in weighing.comparisons)


def test_skerry_is_neither_trivial_nor_hopeless() -> None:
    """At unknown mass ln B was tuned to lie between 3 and 8; the predicted mass is stronger evidence."""
    weighing = weigh(read_analysis(DATA / "skerry" / "skerry.toml"))
    assert weighing.established, weighing.evidences
    ln_b = weighing.comparisons[0].ln_bayes_factor
    assert ln_b is not None
    assert 3.0 < ln_b < 8.0
    held = weigh(read_analysis(DATA / "skerry" / "skerry-fixed-mass.toml")).comparisons[0].ln_bayes_factor
    assert held is not None
    assert held > ln_b


def test_at_marram_the_signal_beats_the_background_and_a_distortion_beats_both() -> None:
    """There is no signal in the truth; the third hypothesis is what keeps it from being claimed."""
    weighing = weigh(read_analysis(DATA / "marram" / "marram.toml"))
    background, glow, neither = (one.probability or 0.0 for one in weighing.posteriors)
    assert neither > glow > 100.0 * background
    assert [caution.code for caution in weighing.cautions] == ["distortion-wins"]


def test_dunlin_depends_on_the_shape_of_its_background() -> None:
    """One shape alone would say odds of more than 7, another of less than 1; the average lies between."""
    (comparison,) = weigh(read_analysis(DATA / "dunlin" / "dunlin.toml")).comparisons
    alone = {one.name: one.ln_bayes_factor or 0.0 for one in comparison.alternatives}
    assert alone["exponential"] < 0.0 < (comparison.ln_bayes_factor or 0.0) < 2.0 < alone["power law"]


@pytest.mark.slow
def test_at_brough_two_levels_are_annealed_and_as_probable_as_one() -> None:
    weighing = weigh(read_analysis(DATA / "brough" / "brough.toml"))
    assert weighing.established, weighing.evidences
    assert [one.engine for one in weighing.evidences] == ["standard", "standard", "annealed"]
    none, one, two = (posterior.probability or 0.0 for posterior in weighing.posteriors)
    assert none < 0.01
    assert 0.4 < one < 0.6
    assert 0.4 < two < 0.6
    assert [caution.code for caution in weighing.cautions] == ["like-signals"]


def test_the_analyses_read_without_a_caution() -> None:
    for path in sorted(DATA.glob("*/*.toml")):
        assert read_analysis(path).cautions == (), path
