"""Whole screens of alternatives, compared as text with tests/expected/, and their records."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path

import pytest

from tests.records import hand_built_backgrounds as hand
from workbench.evidence.backgrounds import AVERAGE
from workbench.records.backgrounds_record import backgrounds_record
from workbench.records.files import record_text
from workbench.records.fit_record import fit_record
from workbench.records.screens.backgrounds import backgrounds_screen
from workbench.records.screens.fit import fit_screen
from workbench.records.screens.layout import WIDEST
from workbench.records.screens.weigh import weigh_screen
from workbench.records.weigh_record import weigh_record

EXPECTED = Path(__file__).parents[1] / "expected"

SCREENS: dict[str, Callable[[], str]] = {
    "backgrounds": lambda: backgrounds_screen(hand.outcome()),
    "backgrounds-planning": lambda: backgrounds_screen(hand.planned()),
    "backgrounds-not-established": lambda: backgrounds_screen(hand.outcome(hand.unestablished())),
    "weigh-alternatives": lambda: weigh_screen(hand.weighed()),
    "fit-alternatives": lambda: fit_screen(hand.fitted()),
}


@pytest.mark.parametrize("name", SCREENS)
def test_a_screen_is_the_one_kept(name: str) -> None:
    assert SCREENS[name]() == (EXPECTED / f"{name}.txt").read_text(encoding="utf-8")


@pytest.mark.parametrize("name", SCREENS)
def test_a_screen_fits_a_terminal(name: str) -> None:
    assert max(len(line) for line in SCREENS[name]().splitlines()) <= WIDEST


def test_expected_counts_are_never_called_observed() -> None:
    text = SCREENS["backgrounds-planning"]()
    assert "nothing here was observed" in " ".join(text.split())
    record = record_text(backgrounds_record(hand.planned()))
    assert '"observed"' not in record


def test_the_record_holds_every_alternative_and_every_fake() -> None:
    record = backgrounds_record(hand.outcome())
    json.dumps(record, allow_nan=False)
    assert [one["name"] for one in record["alternatives"]] == list(hand.NAMES)
    first = record["alternatives"][0]
    assert (first["prior"], first["without_signal"]["posterior"], first["with_signal"]["posterior"]) == (
        0.75,
        0.98,
        0.6,
    )
    assert first["ln_bayes_factor"] == 7.21
    fake = record["fakes"][1]
    assert (fake["truth"], fake["fitted"], fake["ln_bayes_factor"]) == (hand.FALLING, hand.POWER, 0.4)
    assert fake["ln_bayes_factor_faked"] == pytest.approx(0.4 + 1.9)
    (strength,) = fake["strengths"]
    assert strength["in_errors"] == pytest.approx(0.62 / 0.31)
    assert strength["at"] == {"mass": 50.04}
    assert [one["fitted"] for one in record["fakes"]].count(AVERAGE) == 2


def test_before_data_there_is_nothing_but_priors_and_fakes() -> None:
    record = backgrounds_record(hand.planned())
    assert record["ln_bayes_factor"] is None
    assert all(one["without_signal"] is None for one in record["alternatives"])
    assert record["established"] is True


def test_what_is_not_established_is_said_in_the_record() -> None:
    record = backgrounds_record(hand.outcome(hand.unestablished()))
    assert record["established"] is False
    assert record["fakes"][1]["ln_bayes_factor_faked"] is None


def test_the_record_of_a_weighing_holds_its_alternatives() -> None:
    first, second = weigh_record(hand.weighed())["hypotheses"]
    assert [one["posterior"] for one in first["alternatives"]] == [0.98, 0.02]
    assert [one["name"] for one in second["alternatives"][0]["estimators"]] == ["Laplace", "sampling"]
    (comparison,) = weigh_record(hand.weighed())["comparisons"]
    assert [one["ln_bayes_factor"] for one in comparison["alternatives"]] == [7.21, 10.71]
    assert first["adequacy"]["alternative"] == first["fit"]["alternative"] == hand.FALLING


def test_the_record_of_a_fit_holds_the_other_alternatives() -> None:
    first, _ = fit_record(hand.fitted())["hypotheses"]
    assert first["alternative"] == hand.FALLING
    assert [one["alternative"] for one in first["others"]] == [hand.POWER]
