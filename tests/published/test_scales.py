"""The boundaries of the published scales."""

from __future__ import annotations

import numpy as np
import pytest

from tests.published.printed import Printed, of_topic
from workbench.evidence.formulas import scales

BOUNDARY = {
    "kass-raftery-2": scales.KASS_RAFTERY.boundaries[0],
    "kass-raftery-6": scales.KASS_RAFTERY.boundaries[1],
    "kass-raftery-10": scales.KASS_RAFTERY.boundaries[2],
    "jeffreys-grade-1": scales.JEFFREYS.boundaries[0],
    "jeffreys-grade-2": scales.JEFFREYS.boundaries[1],
    "jeffreys-grade-3": scales.JEFFREYS.boundaries[2],
    "jeffreys-grade-4": scales.JEFFREYS.boundaries[3],
    "trotta-1": scales.TROTTA.boundaries[0],
    "trotta-5": scales.TROTTA.boundaries[2],
}


@of_topic("scales", "kass", "jeffreys", "trotta")
def test_a_boundary_as_a_bayes_factor(printed: Printed) -> None:
    printed.check(float(np.exp(BOUNDARY[printed.name])))


@of_topic("scales", "odds")
def test_odds_as_a_probability(printed: Printed) -> None:
    odds = printed.inputs["odds"]
    printed.check(float(scales.probability(odds)))
    printed.check(float(scales.probability_from_ln(np.log(odds))))


@pytest.mark.parametrize("scale", scales.SCALES, ids=lambda scale: scale.name)
def test_a_scale_has_a_word_for_every_grade(scale: scales.Scale) -> None:
    assert len(scale.grades) == len(scale.boundaries) + 1
    assert list(scale.boundaries) == sorted(scale.boundaries)


def test_evidence_against_has_the_grade_of_evidence_for() -> None:
    assert [scales.KASS_RAFTERY.grade(sign * 3.5) for sign in (1.0, -1.0)] == [2, 2]
    assert scales.KASS_RAFTERY.grade(0.2) == 0
    assert scales.KASS_RAFTERY.grade(1.0) == 1


def test_ten_decibans_are_a_factor_of_ten() -> None:
    assert float(scales.decibans(np.log(10.0))) == pytest.approx(10.0, rel=1e-14)
