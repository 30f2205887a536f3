"""The asymptotic local p-value from the profile likelihood."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy import stats

from tests.analyses import BOTH, seen_bump
from tests.evidence.small_analyses import TAU, counting, source
from workbench.evidence.formulas import on_off
from workbench.evidence.prior_choice.local_p import differs_by, local_p
from workbench.hypotheses.hypothesis import Hypothesis
from workbench.hypotheses.priors import Exponential, Uniform

NULL = "background only"


def test_a_count_on_a_known_background_by_hand() -> None:
    """q0 = 2 (n ln(n/b) - (n - b)); p from scipy's normal tail."""
    found = local_p(counting(14, 3.8, Exponential(1.0)), BOTH, NULL, "strength", 20.0)
    assert found is not None
    expected = 2.0 * (14.0 * np.log(14.0 / 3.8) - 10.2)
    assert found.statistic == pytest.approx(expected, abs=1e-6)
    assert found.p == pytest.approx(float(stats.norm.sf(np.sqrt(expected))), rel=1e-6)
    assert found.at["strength"] == pytest.approx(10.2 / 6.0, rel=1e-4)


def test_the_declared_range_of_the_strength_does_not_limit_it() -> None:
    narrow = local_p(counting(14, 3.8, Uniform(0.0, 0.3)), BOTH, NULL, "strength", 20.0)
    wide = local_p(counting(14, 3.8, Exponential(1.0)), BOTH, NULL, "strength", 20.0)
    assert narrow is not None
    assert wide is not None
    assert narrow.p == pytest.approx(wide.p, rel=1e-5)


def test_on_and_off_counts_have_the_likelihood_ratio_of_li_and_ma() -> None:
    """T.P. Li, Y.Q. Ma, Astrophys. J. 272 (1983) 317, equation 17; a flat prior is but a range."""
    analysis = counting(18, Uniform(0.0, 60.0), Exponential(1.0), control=24)
    found = local_p(analysis, BOTH, NULL, "strength", 20.0)
    assert found is not None
    expected = float(on_off.likelihood_ratio(18.0, 24.0, TAU))
    assert np.sqrt(found.statistic) == pytest.approx(expected, abs=1e-4)


def test_a_deficit_has_no_significance() -> None:
    found = local_p(counting(1, 3.8, Exponential(1.0)), BOTH, NULL, "strength", 6.0)
    assert found is not None
    assert found.statistic == pytest.approx(0.0, abs=1e-9)
    assert found.p == pytest.approx(0.5)


def test_a_searched_mass_is_at_its_best() -> None:
    found = local_p(seen_bump(2.5, 45.0), BOTH, NULL, "strength", 20.0)
    assert found is not None
    assert found.at["mass"] == pytest.approx(45.0, abs=1.5)


def test_hypotheses_that_differ_by_more_than_a_signal_have_none() -> None:
    analysis = counting(14, 3.8, Exponential(1.0), uncertainties=(source("size", background=0.1),))
    other = replace(
        analysis, hypotheses=(Hypothesis("nothing", ("signal",)), Hypothesis(BOTH, ("background", "signal")))
    )
    assert not differs_by(other, BOTH, "nothing", "strength")
    assert local_p(other, BOTH, "nothing", "strength", 20.0) is None
    assert differs_by(analysis, BOTH, NULL, "strength")
