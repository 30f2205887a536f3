"""The record of `priors`: its keys, and that nothing in it is no JSON."""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path

import pytest

from tests.records import hand_built_priors as hand
from workbench.evidence.prior_choice.curve import LEAST_TOLD
from workbench.evidence.prior_choice.results import PriorSensitivity
from workbench.records.files import read_record, record_text, write_record
from workbench.records.priors_record import priors_record
from workbench.records.screens.powers import MOST, power_lines
from workbench.records.screens.priors import shown_places

KEYS = {
    "format",
    "command",
    "title",
    "inputs",
    "versions",
    "seed",
    "options",
    "notes",
    "established",
    "reason",
    "adequacy_verdict",
    "adequacies",
    "hypothesis",
    "against",
    "parameter",
    "events_of_strength_1",
    "ln_bayes_factor",
    "ln_bayes_factor_error",
    "declared",
    "updating_ratio",
    "families",
    "bounds",
    "local_p",
    "boundaries",
    "wanted_posterior",
    "needed_priors",
    "power_scaling",
    "cautions",
    "warnings",
}


@pytest.mark.parametrize("found", [hand.examination(), hand.unestablished()], ids=["established", "not"])
def test_the_record_has_its_keys_and_is_read_back(found: PriorSensitivity, tmp_path: Path) -> None:
    record = priors_record(hand.examined(found))
    assert set(record) == KEYS
    assert json.loads(record_text(record))["established"] == found.established
    write_record(record, tmp_path / "priors.json")
    assert read_record(tmp_path / "priors.json")["command"] == "priors"


def test_every_ln_b_has_its_error_or_says_what_it_is_below() -> None:
    record = priors_record(hand.examined())
    members = [member for family in record["families"] for member in family["members"]]
    assert {family["name"] for family in record["families"]} >= {"point", "reference-like", "log-uniform"}
    told = [member for member in members if member["ln_bayes_factor"] is not None]
    assert all(member["error"] > 0.0 for member in told)
    assert [member["below"] for member in members if member not in told] == [LEAST_TOLD] * (
        len(members) - len(told)
    )
    assert len(told) < len(members)


def test_nothing_is_told_of_what_is_not_established() -> None:
    record = priors_record(hand.examined(hand.unestablished()))
    assert (record["ln_bayes_factor"], record["updating_ratio"]) == (None, None)
    assert record["families"] == record["bounds"] == record["needed_priors"] == record["power_scaling"] == []
    assert "k-hat is 0.83" in record["reason"]


def test_of_many_nuisance_priors_the_screen_shows_few_and_counts_the_rest() -> None:
    found = hand.examination()
    scalings = tuple(
        replace(one, parameter=f"{one.parameter} {turn}") for turn in range(30) for one in found.scalings
    )
    lines = power_lines(scalings)
    assert sum("in conflict" in line and " ± " in line for line in lines) == MOST
    assert any(line.strip(" ·").startswith(f"{len(scalings) - MOST} more,") for line in lines)
    assert len(priors_record(hand.examined(replace(found, scalings=scalings)))["power_scaling"]) == 150


def test_the_declared_mean_is_among_those_shown_and_they_are_few() -> None:
    found = hand.examination()
    places = shown_places(found)
    assert len(places) <= 8
    assert found.declared.mean in found.means[places]
