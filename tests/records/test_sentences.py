"""Sentences that are the same wherever a result is read."""

from __future__ import annotations

from dataclasses import replace

from tests.records import hand_built as hand
from workbench.hypotheses.exposure import Exposure
from workbench.hypotheses.quantities import Curve
from workbench.hypotheses.uncertainties import Effect
from workbench.records.descriptions import effect_words, exposure_words, percent, quantity_words
from workbench.records.sentences import usual_cautions, verdict_on_all


def test_nothing_fits_only_when_everything_fails() -> None:
    assert verdict_on_all(hand.adequacies(0.0005, 0.0005)) == "neither hypothesis describes the data"
    assert verdict_on_all(hand.adequacies(0.0005, 0.5)) == ""
    assert verdict_on_all(()) == ""
    three = (*hand.adequacies(0.0005, 0.0005), hand.adequacies(0.0005)[0])
    assert verdict_on_all(three) == "no hypothesis describes the data"


def test_a_searched_range_is_named() -> None:
    texts = {item.code: item.text for item in usual_cautions(hand.analysis(), hand.weighing().comparisons)}
    assert '"mass" (uniform from 25 to 75, in GeV)' in texts["look-elsewhere"]
    assert "strength" in texts["strength-prior"]


def test_a_place_held_beforehand_is_cautioned_about() -> None:
    analysis = hand.analysis()
    held = replace(analysis.hypotheses[1], fix={"mass": 45.0})
    analysis = replace(analysis, hypotheses=(analysis.hypotheses[0], held))
    texts = {item.code: item.text for item in usual_cautions(analysis, hand.weighing().comparisons)}
    assert "taken as known beforehand" in texts["look-elsewhere"]


def test_a_strength_is_no_searched_range_even_where_nothing_is_established() -> None:
    """Without odds there is no sensitivity either, and the strength was said to be the range searched."""
    bare = tuple(replace(comparison, sensitivity=()) for comparison in hand.weighing().comparisons)
    texts = {item.code: item.text for item in usual_cautions(hand.analysis(), bare)}
    assert 'prior of "mass"' in texts["look-elsewhere"]
    assert "strength" not in texts["look-elsewhere"]
    assert "strength" in texts["strength-prior"]


def test_an_exposure_whose_unit_is_a_number_is_a_product() -> None:
    """The screen said "3.2 1e18 protons on target"."""
    assert exposure_words(Exposure(3.2, "10^18 protons on target")) == "3.2 × 10^18 protons on target"
    assert exposure_words(Exposure(24.0, "fb^-1")) == "24 fb^-1"
    assert exposure_words(Exposure(86.0)) == "86"


def test_effects_are_said_with_their_sign() -> None:
    assert effect_words(Effect("a", 0.1)) == "+10 %"
    assert effect_words(Effect("a", 0.03, -0.04, ("peak",))) == "+3 % / −4 % in peak"
    assert effect_words(Effect("a", "hard", "soft")) == 'columns "hard" / "soft"'
    assert percent(-0.005) == "−0.5 %"


def test_a_quantity_is_said_as_what_it_is_made_of() -> None:
    curve = Curve("mass", (20.0, 80.0), (1.0, 2.0))
    assert quantity_words((30.0, "acceptance", curve)) == "30 × acceptance × a curve over mass"
