"""A fit with alternatives is the best of the fits with one each; so are adequacy and what priors predict."""

from __future__ import annotations

import numpy as np
import pytest

import workbench as wb
from tests.evidence.test_averaging import known, shaped
from workbench.ensembles.predictive import prior_predictive
from workbench.evidence.weigh import weigh
from workbench.hypotheses.alternatives import variants_of

BOTH = "signal plus background"


def test_the_best_alternative_is_returned_and_the_others_are_kept() -> None:
    found = wb.fit(shaped(), BOTH)
    plain = {one.name: wb.fit(one.analysis, BOTH) for one in variants_of(shaped())}
    assert found.alternative == max(plain, key=lambda name: plain[name].penalised)
    for one in (found, *found.others):
        assert one.penalised == plain[one.alternative].penalised
        assert one.fitted == plain[one.alternative].fitted
    assert found.penalised >= found.others[0].penalised
    assert {found.alternative, *(one.alternative for one in found.others)} == set(plain)


def test_a_fit_without_doubt_has_no_others() -> None:
    found = wb.fit(variants_of(shaped())[0].analysis, BOTH)
    assert (found.alternative, found.others) == ("", ())


def test_adequacy_is_that_of_the_likeliest_alternative() -> None:
    weighing = weigh(shaped())
    found = wb.adequacy(shaped(), BOTH, most=200, weighing=weighing)
    chances = {one.name: one.posterior or 0.0 for one in weighing.evidences[1].alternatives}
    assert found.alternative == max(chances, key=lambda name: chances[name])
    (judged,) = [one.analysis for one in variants_of(shaped()) if one.name == found.alternative]
    assert found.p == wb.adequacy(judged, BOTH, most=200).p
    assert wb.adequacy(shaped(), BOTH, most=200) == found


def test_priors_predict_a_mixture_of_the_alternatives() -> None:
    """3 or 60 events known, 3 : 1: two thirds of the draws and more lie near 3, and the median too."""
    found = prior_predictive(known(3.0, 60.0, weights=(3.0, 1.0)), "background only", draws=4000)
    assert found.total_median == pytest.approx(4.0, abs=1.0)
    assert found.total_high > 40.0
    swapped = prior_predictive(known(3.0, 60.0, weights=(1.0, 3.0)), "background only", draws=4000)
    assert swapped.total_median > 40.0
    assert np.all(swapped.low < 10.0)
