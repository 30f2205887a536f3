"""`oddsbench scan` and `weigh --reprior`: what is printed and written, what is refused, how it ends."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import pytest

from tests.records import hand_scans as scans
from workbench.commands import scan as scan_command
from workbench.commands.main import main
from workbench.commands.reprior import priors_of
from workbench.errors import InputError
from workbench.hypotheses.priors import Exponential, Uniform
from workbench.records.files import write_record
from workbench.records.scan_record import scan_record

SKERRY = Path(__file__).parents[2] / "data" / "skerry" / "skerry-fixed-mass.toml"
MASS = "mass={ uniform = { low = 40, high = 50 } }"
STRENGTH = "strength = { exponential = { mean = 1 } }"


@pytest.fixture
def record(tmp_path: Path) -> Path:
    path = tmp_path / "scan.json"
    write_record(scan_record(scans.outcome()), path)
    return path


@pytest.fixture
def answered(monkeypatch: pytest.MonkeyPatch) -> list[Any]:
    """Let the scan answer with what was built by hand, and keep what it was asked for."""
    asked: list[Any] = []

    def answer(analysis: object, over: object, *, hypothesis: object, seed: int) -> object:
        asked.append((over, hypothesis, seed))
        return scans.scan() if over != ["mass"] else scans.over_mass()

    monkeypatch.setattr(scan_command, "scan", answer)
    return asked


def test_a_scan_is_printed_and_kept_and_a_reader_applies_a_prior_to_it(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    kept = tmp_path / "scan.json"
    assert main(["scan", str(SKERRY), "--over", "strength", "--output", str(kept)]) == 0
    shown = capsys.readouterr().out
    assert "R at strength 0  1 (exact)" in shown
    stated = json.loads(kept.read_text(encoding="utf-8"))
    assert main(["weigh", "--reprior", str(kept), "--json"]) == 0
    again = json.loads(capsys.readouterr().out)
    (comparison,) = again["comparisons"]
    assert comparison["ln_bayes_factor"] == pytest.approx(stated["average"]["ln_bayes_factor"], abs=1e-5)
    assert comparison["ln_bayes_factor"] == pytest.approx(stated["ln_bayes_factor"], abs=0.03)
    assert again["inputs"]["digest"] == stated["digest"]
    narrow = ["weigh", "--reprior", str(kept), "--prior", "strength={ uniform = { low = 0, high = 10 } }"]
    assert main([*narrow, "--json"]) == 0
    (wide,) = json.loads(capsys.readouterr().out)["comparisons"]
    assert wide["ln_bayes_factor"] == pytest.approx(comparison["ln_bayes_factor"] - 0.693, abs=0.03)


def test_over_and_hypothesis_reach_the_scan(answered: list[Any], capsys: pytest.CaptureFixture[str]) -> None:
    words = ["scan", str(SKERRY), "--over", "strength", "--over", "mass", "--hypothesis", "resonance"]
    assert main([*words, "--seed", "7"]) == 0
    assert main(["scan", str(SKERRY)]) == 0
    assert answered == [(["strength", "mass"], "resonance", 7), (None, None, 1)]
    capsys.readouterr()
    assert main(["scan", str(SKERRY), "--json"]) == 0
    found = json.loads(capsys.readouterr().out)
    assert found["options"] == {"over": "strength, mass", "hypothesis": "resonance"}


@pytest.mark.usefixtures("answered")
@pytest.mark.parametrize("over", [[], ["--over", "mass"]])
@pytest.mark.parametrize("ending", ["png", "svg"])
def test_a_picture_is_drawn(over: list[str], ending: str, tmp_path: Path) -> None:
    picture = tmp_path / f"scan.{ending}"
    assert main(["scan", str(SKERRY), *over, "--picture", str(picture)]) == 0
    assert picture.stat().st_size > 5000


def test_what_is_not_established_ends_with_1(
    monkeypatch: pytest.MonkeyPatch, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setattr(scan_command, "scan", lambda *given, **options: scans.unestablished())
    path = tmp_path / "scan.json"
    assert main(["scan", str(SKERRY), "--output", str(path)]) == 1
    assert main(["weigh", "--reprior", str(path)]) == 1
    shown = capsys.readouterr().out
    assert "NO ODDS ARE GIVEN" in shown
    assert "posterior odds" not in shown


def test_a_scan_without_a_surface_has_no_picture_but_a_reason(
    monkeypatch: pytest.MonkeyPatch, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setattr(scan_command, "scan", lambda *given, **options: scans.nowhere())
    assert main(["scan", str(SKERRY)]) == 1
    assert "no parameter value can produce" in capsys.readouterr().out
    assert main(["scan", str(SKERRY), "--picture", str(tmp_path / "scan.png")]) == 2
    assert "R is known nowhere" in capsys.readouterr().err


def test_priors_are_read_with_their_parameters() -> None:
    found = priors_of([MASS, STRENGTH, '"line energy"={ uniform = { low = 1, high = 2 } }'])
    assert found == {
        "mass": Uniform(40, 50),
        "strength": Exponential(1),
        "line energy": Uniform(1, 2),
    }


@pytest.mark.parametrize(
    ("given", "words"),
    [
        (["mass"], "A prior without its parameter"),
        (["={ uniform = { low = 0, high = 1 } }"], "A prior without its parameter"),
        ([MASS, MASS], "Two priors of one parameter"),
        (["mass=uniform 30 60"], "A prior that cannot be read"),
        (["mass=uniform = { low = 30, high = 60 }"], "A prior without its outer braces"),
        (["mass={ flat = { low = 30, high = 60 } }"], "A prior family that is not known"),
        (["mass={ uniform = { low = 30, high = inf } }"], "An improper prior"),
    ],
)
def test_priors_that_are_none_are_refused(given: list[str], words: str) -> None:
    with pytest.raises(InputError) as caught:
        priors_of(given)
    assert words in str(caught.value)


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (["--prior", "mass={ uniform = { low = 5, high = 50 } }"], "reaches outside the range"),
        (["--prior", "width={ uniform = { low = 5, high = 50 } }"], "not known over"),
        (["--picture", "odds.png"], "--picture does not go with --reprior"),
        (["--save", "new.toml"], "--save does not go with --reprior"),
        (["file.toml"], "FILE does not go with --reprior"),
        (["--output", "/no/such/folder/x.json"], "File can't be written"),
    ],
)
def test_what_does_not_go_with_a_saved_scan_is_refused(
    words: list[str], said: str, record: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(["weigh", "--reprior", str(record), *words]) == 2
    assert said in capsys.readouterr().err


def test_a_prior_alone_is_refused_and_says_how_to_get_a_saved_scan(
    capsys: pytest.CaptureFixture[str],
) -> None:
    assert main(["weigh", str(SKERRY), "--prior", MASS]) == 2
    said = capsys.readouterr().err
    assert "--prior without a saved updating ratio" in said
    assert "oddsbench scan" in said


@pytest.mark.parametrize("content", ["", "{}", "[1, 2", '{"format": 1, "command": "weigh"}', "\x00"])
def test_a_file_that_is_no_saved_scan_is_refused(
    content: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    path = tmp_path / "scan.json"
    path.write_text(content, encoding="utf-8")
    assert main(["weigh", "--reprior", str(path)]) == 2
    assert "scan.json" in capsys.readouterr().err


def test_a_saved_scan_that_is_not_there_is_refused(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(["weigh", "--reprior", str(tmp_path / "none.json")]) == 2
    assert "none.json" in capsys.readouterr().err


def test_weigh_still_asks_for_a_file(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["weigh"]) == 2
    assert "No file was named" in capsys.readouterr().err
