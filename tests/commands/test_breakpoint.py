"""`breakpoint` from the command line: options, exit codes, what is printed, written and drawn."""

from __future__ import annotations

import json
import math
from dataclasses import replace
from pathlib import Path

import pytest

import workbench as wb
from tests.records import broken
from workbench.commands import breakpoint as command
from workbench.commands.main import main
from workbench.evidence.breaking.results import BreakPoint

ROOT = Path(__file__).parents[2]
SORREL = str(ROOT / "data" / "sorrel" / "sorrel.toml")


def test_the_command_says_what_python_says(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["breakpoint", SORREL, "--below", "0.5", "--json"]) == 0
    record = json.loads(capsys.readouterr().out)
    found = wb.break_point(wb.read_analysis(SORREL), below=0.5)
    assert record["under_peak"] == found.under_peak
    assert record["rms_error"] == found.rms_error
    assert record["options"]["below"] == 0.5
    assert record["seed"] == 1


def test_posterior_odds_are_another_way_to_say_the_threshold(capsys: pytest.CaptureFixture[str]) -> None:
    """Prior odds are even at Sorrel, so that odds of 2 : 1 are ln B = ln 2."""
    assert main(["breakpoint", SORREL, "--odds", "2", "--within", "0.9", "--json"]) == 0
    assert json.loads(capsys.readouterr().out)["below"] == pytest.approx(math.log(2.0))


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (["--below", "three"], "--below is not a number"),
        (["--below", "nan"], "--below is not a number"),
        (["--odds", "-2"], "Odds that are not above 0"),
        (["--odds", "2", "--below", "1"], "Two thresholds"),
        (["--terms", "0"], "--terms is not in its range"),
        (["--terms", "4"], "More terms of a distortion than bins"),
        (["--within", "5"], "A range that is no part of the background"),
        (["--hypothesis", "signal plus backgruond"], "No hypothesis of this name"),
        (["--region", "control"], "A region without both signal and background"),
        (["--picture", "b.jpg"], "A kind of picture that is not drawn"),
        (["--output", "nowhere/b.json"], "File can't be written"),
    ],
)
def test_what_cannot_be_done_is_refused_with_2(
    words: list[str], said: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(["breakpoint", SORREL, *words]) == 2
    error = capsys.readouterr()
    assert error.out == ""
    assert error.err.startswith(said)
    assert "  try  " in error.err


@pytest.mark.parametrize(
    ("found", "code"),
    [
        (broken.break_point(), 0),
        (broken.not_within(), 0),
        (broken.below_already(), 0),
        (broken.not_settled(), 1),
        (broken.not_established(), 1),
    ],
)
def test_only_what_is_not_established_ends_with_1(
    found: BreakPoint, code: int, monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    given = broken.outcome()
    monkeypatch.setattr(command, "load", lambda options, seed: (given.analysis, replace(given.origin)))
    monkeypatch.setattr(command, "break_point", lambda analysis, **asked: found)
    picture, text = tmp_path / "b.svg", tmp_path / "b.txt"
    assert main(["breakpoint", "tern.toml", "--picture", str(picture), "--output", str(text)]) == code
    assert picture.read_bytes().startswith(b"<?xml")
    assert text.read_text(encoding="utf-8").startswith("Narrow resonance at Tern")
