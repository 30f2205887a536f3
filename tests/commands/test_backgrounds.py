"""The command on a demonstration: what is printed, what is written, how it ends."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from workbench.commands.main import main
from workbench.records.files import read_record

DATA = Path(__file__).parents[2] / "data"
DUNLIN = str(DATA / "dunlin" / "dunlin.toml")


def test_the_record_the_text_and_the_picture_are_made(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    record, picture = tmp_path / "dunlin.json", tmp_path / "dunlin.png"
    assert main(["backgrounds", DUNLIN, "--output", str(record), "--picture", str(picture)]) == 0
    said = capsys.readouterr()
    assert "The signal that each would fake" in said.out
    assert "warning: Fitted with" in said.err
    kept = read_record(record)
    assert kept["command"] == "backgrounds"
    assert kept["options"] == {"hypothesis": "resonance"}
    assert len(kept["fakes"]) == 12
    assert picture.read_bytes().startswith(b"\x89PNG")


def test_it_agrees_with_what_weigh_says(capsys: pytest.CaptureFixture[str]) -> None:
    main(["backgrounds", DUNLIN, "--json"])
    compared = json.loads(capsys.readouterr().out)
    main(["weigh", DUNLIN, "--json", "--pseudo-experiments", "200"])
    weighed = json.loads(capsys.readouterr().out)
    assert compared["ln_bayes_factor"] == weighed["comparisons"][0]["ln_bayes_factor"]
    for key, hypothesis in zip(("without_signal", "with_signal"), weighed["hypotheses"], strict=True):
        for one, other in zip(compared["alternatives"], hypothesis["alternatives"], strict=True):
            assert one[key]["ln_evidence"] == other["ln_evidence"]


@pytest.mark.parametrize(
    ("words", "what"),
    [
        ([str(DATA / "sorrel" / "sorrel.toml")], "No background is in doubt"),
        ([DUNLIN, "--hypothesis", "resonence"], "No hypothesis of this name"),
        ([DUNLIN, "--picture", "x.gif"], "A kind of picture that is not drawn"),
        ([DUNLIN, "--output", "nowhere/x.json"], "File can't be written"),
    ],
)
def test_what_cannot_be_done_is_refused(
    words: list[str], what: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(["backgrounds", *words]) == 2
    said = capsys.readouterr()
    assert said.out == ""
    assert said.err.startswith(what)
