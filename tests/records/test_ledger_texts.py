"""The ledger as text and as a record."""

from __future__ import annotations

import json
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import pytest

from tests.records import hand_built as hand
from tests.records import hand_built_ledger as built
from workbench.evidence.ledger.results import Hold
from workbench.records.files import read_record, record_text, write_record
from workbench.records.ledger_record import ledger_record
from workbench.records.ledger_words import part_words, reading
from workbench.records.screens.layout import WIDEST, plain_ascii
from workbench.records.screens.ledger import MOST_UNCERTAINTIES, bars, ledger_screen, uncertainty_lines

EXPECTED = Path(__file__).parents[1] / "expected"

SCREENS: dict[str, Callable[[], str]] = {
    "ledger": lambda: ledger_screen(built.accounted()),
    "ledger-ascii": lambda: plain_ascii(ledger_screen(built.accounted())),
    "ledger-without-shares": lambda: ledger_screen(built.accounted(built.without_shares())),
    "ledger-not-established": lambda: ledger_screen(built.missing()),
    "ledger-neither-fits": lambda: ledger_screen(built.accounted(judged=hand.adequacies(0.0005, 0.0005))),
}


@pytest.mark.parametrize("name", SCREENS)
def test_the_screen_is_as_kept(name: str) -> None:
    assert SCREENS[name]() == (EXPECTED / f"{name}.txt").read_text(encoding="utf-8")


@pytest.mark.parametrize("name", SCREENS)
def test_no_line_is_wider_than_a_terminal(name: str) -> None:
    assert max(len(line) for line in SCREENS[name]().splitlines()) <= WIDEST


def test_the_reading_is_one_line_each() -> None:
    sentences = reading(hand.analysis(), built.account())
    assert len(sentences) == 2
    assert sentences[0] == (
        "Without bin 6 (45 to 50 GeV) the odds are 2.00 : 1 instead of 224 : 1. This single bin decides the "
        "verdict."
    )
    assert sentences[1] == (
        'Of the uncertainties, "continuum normalisation" moves the odds most: 331 : 1 with it frozen and '
        "67.9 : 1 with it twice as large, 224 : 1 as declared."
    )


def test_a_bin_is_named_with_its_region_where_there_are_several() -> None:
    analysis = hand.analysis()
    two = replace(analysis, regions=(*analysis.regions, replace(analysis.regions[0], name="side")))
    assert part_words(two, built.account().bins[0]) == 'bin 1 of "peak" (20 to 25 GeV)'
    assert part_words(two, built.whole()) == 'region "peak"'


def test_bars_show_sign_and_size() -> None:
    assert bars([2.0, -1.0, 0.0, None, 0.1]) == ["++++++++", "−−−−", "", "", ""]
    assert bars([]) == []
    assert bars([0.0, None]) == ["", ""]


def test_many_uncertainties_are_cut_where_they_no_longer_matter() -> None:
    holds = tuple(
        Hold(f"source {number}", "source", built.VALUE + 0.01 * number, 0.001, None, None)
        for number in range(1, 41)
    )
    lines = uncertainty_lines(replace(built.account(), uncertainties=holds))
    assert len(lines) == 1 + MOST_UNCERTAINTIES + 2
    assert "a prior without a width" in lines[-2]
    assert lines[1].split()[:2] == ["source", "40"]
    assert lines[-1].strip() == "The 25 others change ln B by 0.25 or less."


def test_the_record_holds_every_number() -> None:
    outcome = built.accounted()
    record = json.loads(record_text(ledger_record(outcome)))
    (account,) = record["accounts"]
    assert record["command"] == "ledger"
    assert record["options"]["orders"] == 64
    assert [one["share"] for one in account["bins"]] == pytest.approx(built.SHARES.tolist())
    assert [one["loss"] for one in account["bins"]] == pytest.approx(built.LOSSES.tolist())
    assert account["bins"][5]["way"] == "fresh evidence"
    assert account["bins"][5]["bin"] == 6
    assert account["bins"][0]["share_error"] == pytest.approx(0.0303, abs=1e-4)
    assert account["shares"]["total"] == 7.725
    assert account["regions"][0]["ln_bayes_factor_without"] == -0.01
    assert account["uncertainties"][1]["ln_bayes_factor_doubled"] is None
    assert account["reading"] == reading(outcome.analysis, outcome.ledger.accounts[0])
    assert record["warnings"][0]["code"] == "one-bin-decides"


def test_what_is_not_established_is_null_in_the_record(tmp_path: Path) -> None:
    kept = tmp_path / "ledger.json"
    write_record(ledger_record(built.accounted(built.without_shares())), kept)
    record = read_record(kept)
    (account,) = record["accounts"]
    assert record["established"] is False
    assert {one["share"] for one in account["bins"]} == {None}
    assert account["bins"][5]["ln_bayes_factor_without"] is None
    assert account["shares"]["reason"].startswith("half of the orders")
