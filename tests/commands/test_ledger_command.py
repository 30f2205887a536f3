"""`oddsbench ledger` from the file to what a user reads."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import pytest

from workbench.commands.main import main
from workbench.records.files import read_record

DATA = Path(__file__).parents[2] / "data"
SORREL = DATA / "sorrel" / "sorrel.toml"
TARN = DATA / "tarn" / "tarn.toml"
BARE = DATA / "skerry" / "counts.csv"


def recorded(path: Path, capsys: pytest.CaptureFixture[str], *options: str, code: int = 0) -> dict[str, Any]:
    """Return the record that `ledger --json` prints."""
    assert main(["ledger", str(path), "--json", "--orders", "4", *options]) == code
    record: dict[str, Any] = json.loads(capsys.readouterr().out)
    return record


def test_the_shares_of_a_record_add_up(capsys: pytest.CaptureFixture[str]) -> None:
    (account,) = recorded(SORREL, capsys)["accounts"]
    total = sum(one["share"] for one in account["bins"])
    assert total == pytest.approx(account["shares"]["total"], abs=1e-12)
    assert sum(one["share"] for one in account["regions"]) == pytest.approx(total, abs=1e-12)
    assert account["uncertainties"][0]["name"] == "stray muons"


@pytest.mark.parametrize("by", ["bins", "regions", "uncertainties"])
def test_only_what_is_asked_for_is_there(by: str, capsys: pytest.CaptureFixture[str]) -> None:
    record = recorded(SORREL, capsys, "--by", by)
    (account,) = record["accounts"]
    assert record["options"]["by"] == by
    assert {kind for kind in ("bins", "regions", "uncertainties") if account[kind]} == {by}
    assert (account["shares"] is None) == (by == "uncertainties")


def test_one_hypothesis_can_be_chosen(capsys: pytest.CaptureFixture[str]) -> None:
    record = recorded(TARN, capsys, "--by", "regions", "--hypothesis", "line at 1310 keV")
    assert [one["hypothesis"] for one in record["accounts"]] == ["line at 1310 keV"]
    assert len(record["hypotheses"]) == 3


def test_a_histogram_alone_has_a_ledger_and_a_picture(
    capsys: pytest.CaptureFixture[str], tmp_path: Path
) -> None:
    kept, drawn = tmp_path / "ledger.json", tmp_path / "ledger.png"
    words = ["ledger", str(BARE), "--orders", "2", "--by", "bins"]
    assert main([*words, "--output", str(kept), "--picture", str(drawn)]) == 0
    screen = capsys.readouterr().out
    assert "Without bin 25 (44 to 45) the odds are" in screen
    assert "48 others" in screen
    assert len(read_record(kept)["accounts"][0]["bins"]) == 60
    assert drawn.stat().st_size > 10_000


def test_the_same_seed_gives_the_same_ledger(capsys: pytest.CaptureFixture[str]) -> None:
    first, again, other = (recorded(SORREL, capsys, "--seed", seed) for seed in ("7", "7", "8"))
    assert first == again
    assert first["accounts"] != other["accounts"]


@pytest.mark.parametrize(
    ("options", "found", "remedy"),
    [
        (["--by", "bin"], '"bin"', 'write "bins"'),
        (["--orders", "1"], '"1"', "--orders 2"),
        (
            ["--hypothesis", "signl plus background"],
            '"signl plus background"',
            'write "signal plus background"',
        ),
        (["--picture", "ledger.gif"], '"ledger.gif"', "--picture ledger.png"),
    ],
)
def test_a_wrong_option_is_answered_in_the_form_of_every_problem(
    options: list[str], found: str, remedy: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(["ledger", str(SORREL), *options]) == 2
    said = capsys.readouterr()
    assert said.out == ""
    assert f"found     {found}" in said.err
    assert f"try       {remedy}" in said.err


def test_without_observed_counts_there_is_no_ledger(
    capsys: pytest.CaptureFixture[str], tmp_path: Path
) -> None:
    planned = tmp_path / "planned.csv"
    planned.write_text("low,high,background,signal\n0,1,5,2\n1,2,5,1\n", encoding="utf-8")
    assert main(["ledger", str(planned)]) == 2
    assert "ledger needs observed counts" in capsys.readouterr().err
