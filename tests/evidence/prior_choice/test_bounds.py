"""No prior of a class exceeds its bound, and the member that is named reaches it."""

from __future__ import annotations

import numpy as np
import pytest

from tests.evidence.prior_choice.curves import counted, curve_of
from workbench.evidence.prior_choice.averages import average
from workbench.evidence.prior_choice.bounds import (
    Bound,
    largest_never_rising,
    largest_of_any,
    largest_with_peak,
)
from workbench.evidence.prior_choice.curve import StrengthCurve
from workbench.hypotheses.priors import Exponential, Fixed, Gamma, HalfNormal, LogNormal, Prior, Uniform

EXCESS = curve_of(counted(14.0, 3.8, 6.0), 20.0)
DEFICIT = curve_of(counted(1.0, 3.8, 6.0), 6.0)


def value(curve: StrengthCurve, prior: Prior) -> float:
    found = average(curve, prior).ln_bayes_factor
    assert found is not None
    return found


def test_the_best_strength_of_a_count_by_hand() -> None:
    """R is largest where the expectation is the count: s = (n - b)/y."""
    bound = largest_of_any(EXCESS)
    assert bound.low == bound.high == pytest.approx((14.0 - 3.8) / 6.0, abs=0.01)
    assert bound.ln_bayes_factor == pytest.approx(14.0 * np.log(14.0 / 3.8) - 10.2, abs=1e-4)


def test_a_deficit_is_told_best_by_no_signal() -> None:
    for bound in (largest_of_any(DEFICIT), largest_never_rising(DEFICIT)):
        assert bound.ln_bayes_factor == pytest.approx(0.0, abs=1e-3)
        assert bound.high == pytest.approx(0.0, abs=0.03)


@pytest.mark.parametrize(
    "bound",
    [
        largest_of_any(EXCESS),
        largest_never_rising(EXCESS),
        largest_with_peak(EXCESS, 1.0),
        largest_with_peak(EXCESS, 4.0),
    ],
    ids=["any", "never rising", "peak at 1", "peak at 4"],
)
def test_the_named_member_reaches_the_bound(bound: Bound) -> None:
    assert bound.low is not None
    assert bound.high is not None
    member = Fixed(bound.low) if bound.low == bound.high else Uniform(bound.low, bound.high)
    assert value(EXCESS, member) == pytest.approx(bound.ln_bayes_factor, abs=2e-3)


def test_no_prior_that_never_rises_exceeds_the_bound_and_some_that_rise_do() -> None:
    bound = largest_never_rising(EXCESS).ln_bayes_factor
    scales = np.geomspace(0.05, 50.0, 60)
    for scale in scales.tolist():
        falling = (Exponential(scale), HalfNormal(scale), Uniform(0.0, scale), Gamma(0.6, 1.0 / scale))
        assert max(value(EXCESS, prior) for prior in falling) <= bound + 1e-6
    # The negative control: a gamma of shape 6 rises first, and gets beyond.
    assert value(EXCESS, Gamma(6.0, 3.5)) > bound + 0.1


def test_random_mixtures_of_uniforms_stay_below_their_bounds() -> None:
    """Brute force: 2,000 mixtures of uniform priors that end at the peak."""
    generator = np.random.default_rng(20)
    strengths = np.linspace(0.0, 20.0, 4001)
    ratio = np.exp(counted(14.0, 3.8, 6.0)(strengths))
    whole = np.concatenate([[0.0], np.cumsum(0.5 * (ratio[1:] + ratio[:-1]) * np.diff(strengths))])
    for peak, bound in ((0.0, largest_never_rising(EXCESS)), (1.0, largest_with_peak(EXCESS, 1.0))):
        ends = generator.choice(strengths[np.abs(strengths - peak) > 0.02], size=(2000, 8))
        means = (np.interp(ends, strengths, whole) - np.interp(peak, strengths, whole)) / (ends - peak)
        mixed = (generator.dirichlet(np.full(8, 0.3), 2000) * means).sum(axis=1)
        assert np.log(mixed.max()) <= bound.ln_bayes_factor + 1e-6
        assert np.log(means.max()) == pytest.approx(bound.ln_bayes_factor, abs=2e-3)


def test_a_peak_at_the_best_strength_is_worth_as_much_as_any_prior() -> None:
    best = largest_of_any(EXCESS)
    assert best.low is not None
    assert largest_with_peak(EXCESS, best.low).ln_bayes_factor == pytest.approx(
        best.ln_bayes_factor, abs=1e-6
    )


def test_a_single_peak_elsewhere_allows_more_than_the_priors_that_have_it() -> None:
    bound = largest_with_peak(EXCESS, 1.0).ln_bayes_factor
    for factor in (1.1, 1.5, 2.0, 4.0):
        sd = np.log(factor)  # a log-normal's peak is at median exp(-sd^2)
        assert value(EXCESS, LogNormal(float(np.exp(sd**2)), factor)) <= bound
