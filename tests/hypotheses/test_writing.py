"""What is written is read back as it was, and what has not changed keeps its words.

The expectations are the files themselves: equality of content, and differences of text line by line.
"""

from __future__ import annotations

import difflib
import math
import stat
import tomllib
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import pytest

import workbench as wb
from workbench.hypotheses.file.toml_text import value_text

ROOT = Path(__file__).parents[2]
FILES = Path(__file__).parent / "files"
VALID = [
    FILES / "everything.toml",
    FILES / "alternatives.toml",
    *(
        ROOT / "data" / name
        for name in ("skerry/skerry.toml", "tarn/tarn.toml", "sorrel/sorrel.toml", "marram/marram.toml")
    ),
]
Edit = Callable[[wb.Analysis], wb.Analysis]


@pytest.fixture
def everything(tmp_path: Path) -> Path:
    """Return a copy of the file with every kind of declaration, its table beside it."""
    for name in ("everything.toml", "everything.csv"):
        (tmp_path / name).write_bytes((FILES / name).read_bytes())
    return tmp_path / "everything.toml"


def changed_lines(path: Path, analysis: wb.Analysis) -> list[str]:
    """Write an analysis over a file and return the lines that differ, after reading it back."""
    before = path.read_text(encoding="utf-8").splitlines()
    wb.write_analysis(analysis, path, keep=path)
    assert wb.read_analysis(path) == analysis
    after = path.read_text(encoding="utf-8").splitlines()
    return [line for line in difflib.ndiff(before, after) if line[0] in "+-"]


def with_prior(analysis: wb.Analysis, name: str, prior: object) -> wb.Analysis:
    """Return an analysis with another prior for one parameter."""
    changed = [replace(one, prior=prior) if one.name == name else one for one in analysis.parameters]
    return replace(analysis, parameters=tuple(changed))


@pytest.mark.parametrize("file", VALID, ids=lambda file: file.stem)
def test_an_unchanged_analysis_leaves_its_file_byte_for_byte(file: Path, tmp_path: Path) -> None:
    for source in [file, *file.parent.glob("*.csv")]:
        (tmp_path / source.name).write_bytes(source.read_bytes())
    path = tmp_path / file.name
    wb.write_analysis(wb.read_analysis(path), path, keep=path)
    assert path.read_bytes() == file.read_bytes()


@pytest.mark.parametrize("file", VALID, ids=lambda file: file.stem)
def test_a_new_file_in_another_folder_is_read_back_as_the_same_analysis(file: Path, tmp_path: Path) -> None:
    analysis = wb.read_analysis(file)
    wb.write_analysis(analysis, tmp_path / "new.toml")
    assert wb.read_analysis(tmp_path / "new.toml") == analysis
    wb.write_analysis(wb.read_analysis(tmp_path / "new.toml"), tmp_path / "newer.toml")
    first, second = ((tmp_path / name).read_text() for name in ("new.toml", "newer.toml"))
    assert first == second


@pytest.mark.parametrize(
    ("edit", "expected"),
    [
        (
            lambda one: with_prior(one, "mass", wb.Uniform(25.0, 75.0)),
            [
                "- prior = { uniform = { low = 20, high = 80 } }   # anywhere",
                "+ prior = { uniform = { low = 25, high = 75 } }   # anywhere",
            ],
        ),
        (
            lambda one: with_prior(one, "strength", wb.HalfNormal(2.0)),
            ["- prior = { uniform = { low = 0, high = 5 } }", "+ prior = { halfnormal = { sd = 2 } }"],
        ),
        (
            lambda one: replace(one, title='say "no" \\ é'),
            ['- title = "Everything at once"   # the title', '+ title = "say \\"no\\" \\\\ é"   # the title'],
        ),
        (
            lambda one: replace(one, exposure=replace(one.exposure, collected=48.0)),
            ["- collected = 24.0   # so far", "+ collected = 48   # so far"],
        ),
        (
            lambda one: replace(one, uncertainties=one.uncertainties[1:]),
            [
                '- [uncertainties."continuum normalisation"]',
                "- effects.continuum = 0.10                         # one sd",
            ],
        ),
    ],
    ids=["number", "family", "title", "exposure", "removed"],
)
def test_only_what_changed_is_rewritten(edit: Edit, expected: list[str], everything: Path) -> None:
    assert changed_lines(everything, edit(wb.read_analysis(everything))) == expected


@pytest.mark.parametrize(
    "edit",
    [
        lambda one: replace(one, exposure=None),
        lambda one: replace(one, uncertainties=()),
        lambda one: replace(one, hypotheses=()),
        lambda one: replace(one, hypotheses=one.hypotheses[::-1]),
        lambda one: replace(one, processes=one.processes[::-1]),
        lambda one: replace(one, regions=one.regions[::-1]),
        lambda one: replace(
            one, parameters=(*one.parameters, wb.Parameter("new one", wb.Exponential(2.0), "GeV"))
        ),
        lambda one: replace(
            one,
            uncertainties=(
                *one.uncertainties,
                wb.Uncertainty("two", (wb.Effect("flat", 0.3, -0.1, ("side band",)), wb.Effect("cb", 0.2))),
            ),
        ),
        lambda one: replace(
            one,
            regions=(
                *one.regions,
                wb.Region("third", wb.Table(wb.Binning([0, 2], [1, 3]), [3, 4], {"x": [0.1, 2]})),
            ),
        ),
        lambda one: replace(
            one,
            processes=(
                *one.processes,
                wb.Process(
                    "extra", "background", {"side band": wb.Contribution(wb.PowerLaw("rate"), 3.0)}, ("g", 2)
                ),
            ),
        ),
    ],
)
def test_whatever_changes_the_comments_of_the_rest_stay(edit: Edit, everything: Path) -> None:
    analysis = edit(wb.read_analysis(everything))
    wb.write_analysis(analysis, everything, keep=everything)
    assert wb.read_analysis(everything) == analysis
    text = everything.read_text()
    assert "# the title" in text
    assert "# anywhere" in text
    assert "# beside this file" in text


def test_a_table_given_in_python_becomes_a_csv_file_or_edges(tmp_path: Path) -> None:
    templates = wb.Table(
        wb.Binning([0.1, 1], [1, 2.5]), [3, 0], {"a, b": [1 / 3, 1e-9], "c": [1, 2]}, {"c": [0.1, 0]}
    )
    gaps = wb.Table(wb.Binning([0, 2], [1, 3]), None)
    bins = wb.Table(wb.Binning.from_edges([0, 0.1, 0.3]), [4, 5])
    analysis = wb.Analysis(
        "In Python",
        tuple(
            wb.Region(name, table)
            for name, table in {"one/two": templates, "gaps": gaps, "bins": bins}.items()
        ),
        processes=(wb.Process("a", "background", {"one/two": wb.Contribution(wb.Template("a, b"))}),),
    )
    wb.write_analysis(analysis, tmp_path / "p.toml")
    assert sorted(path.name for path in tmp_path.iterdir()) == ["p-gaps.csv", "p-one-two.csv", "p.toml"]
    assert "edges = [0, 0.1, 0.3]\nobserved = [4, 5]" in (tmp_path / "p.toml").read_text()
    assert wb.read_analysis(tmp_path / "p.toml") == analysis


def test_somebody_elses_file_is_not_overwritten_by_a_table(tmp_path: Path) -> None:
    (tmp_path / "p-r.csv").write_text("precious\n")
    table = wb.Table(wb.Binning.from_edges([0, 1]), [4], {"x": [3.5]})
    process = wb.Process("x", "background", {"r": wb.Contribution(wb.Template("x"))})
    analysis = wb.Analysis("Careful", (wb.Region("r", table),), processes=(process,))
    wb.write_analysis(analysis, tmp_path / "p.toml")
    wb.write_analysis(analysis, tmp_path / "p.toml")
    assert (tmp_path / "p-r.csv").read_text() == "precious\n"
    assert sorted(path.name for path in tmp_path.iterdir()) == ["p-r-2.csv", "p-r.csv", "p.toml"]


def test_what_a_file_cannot_hold_leaves_nothing_behind(tmp_path: Path) -> None:
    table = wb.Table(wb.Binning.from_edges([0, 1]), [4], {" x ": [3.5]})
    process = wb.Process("x", "background", {"r": wb.Contribution(wb.Template(" x "))})
    analysis = wb.Analysis("Spaces", (wb.Region("r", table),), processes=(process,))
    with pytest.raises(wb.InputError, match="cannot hold"):
        wb.write_analysis(analysis, tmp_path / "p.toml")
    assert list(tmp_path.iterdir()) == []


def test_writing_is_whole_or_not_at_all(everything: Path) -> None:
    before = everything.read_bytes()
    analysis = wb.read_analysis(everything)
    with pytest.raises(wb.InputError):
        wb.write_analysis(analysis, everything.parent / "missing" / "a.toml", keep=everything)
    everything.chmod(0o600)
    wb.write_analysis(analysis, everything, keep=everything)
    assert everything.read_bytes() == before
    assert stat.S_IMODE(everything.stat().st_mode) == 0o600
    assert sorted(path.name for path in everything.parent.iterdir()) == ["everything.csv", "everything.toml"]


@pytest.mark.parametrize(
    "number",
    [0.0, -0.0, 0.1, 1 / 3, 1e-320, 1.7976931348623157e308, 1e15, 1e16, 123456789.0, -2.5, 1e22, 5e-324],
)
def test_a_number_is_written_with_all_its_digits(number: float) -> None:
    back = float(tomllib.loads(f"x = {value_text(number)}")["x"])
    assert back == number
    assert math.copysign(1.0, back) == math.copysign(1.0, number)


@pytest.mark.parametrize("text", ["", 'a "b" \\ c', "tab\tline\n", "\x00\x7f\x1b", "é Ω 字 😀"])
def test_a_text_is_written_with_every_character(text: str) -> None:
    assert tomllib.loads(f"x = {value_text(text)}\n{value_text(text)} = 1") == {"x": text, text: 1}
