"""Priors against scipy.stats, which has its own distribution functions for most of them."""

from __future__ import annotations

from collections.abc import Callable
from itertools import pairwise
from typing import Any

import numpy as np
import numpy.typing as npt
import pytest
from scipy import integrate, special, stats

from workbench.hypotheses.priors import (
    FAMILIES,
    Beta,
    ContinuousPrior,
    Exponential,
    Fixed,
    Gamma,
    HalfNormal,
    LogNormal,
    LogUniform,
    Normal,
    Uniform,
)

Array = npt.NDArray[np.float64]

CASES: list[tuple[ContinuousPrior, Any]] = [
    (Uniform(-1.0, 4.0), stats.uniform(-1.0, 5.0)),
    (Normal(18.0, 0.5), stats.norm(18.0, 0.5)),
    (Normal(1.0, 2.0, low=0.0), stats.truncnorm(-0.5, np.inf, 1.0, 2.0)),
    (Normal(1.0, 2.0, high=3.0), stats.truncnorm(-np.inf, 1.0, 1.0, 2.0)),
    (Normal(0.0, 1.0, low=5.0, high=9.0), stats.truncnorm(5.0, 9.0)),
    (Normal(0.0, 1.0, low=-9.0, high=-5.0), stats.truncnorm(-9.0, -5.0)),
    (LogNormal(3.0, 1.4), stats.lognorm(np.log(1.4), scale=3.0)),
    (Gamma(2.5, 3.0), stats.gamma(2.5, scale=1.0 / 3.0)),
    (Gamma(0.3, 3.0), stats.gamma(0.3, scale=1.0 / 3.0)),
    (Gamma(400.0, 3.0), stats.gamma(400.0, scale=1.0 / 3.0)),
    (Exponential(2.0), stats.expon(scale=2.0)),
    (HalfNormal(2.0), stats.halfnorm(scale=2.0)),
    (LogUniform(0.1, 20.0), stats.loguniform(0.1, 20.0)),
    (Beta(2.0, 3.0, 1.0, 5.0), stats.beta(2.0, 3.0, 1.0, 4.0)),
    (Beta(0.5, 0.7), stats.beta(0.5, 0.7)),
    (Beta(80.0, 1.5), stats.beta(80.0, 1.5)),
]
EACH = pytest.mark.parametrize(("prior", "law"), CASES, ids=[prior.text() for prior, _ in CASES])
MIDDLE = np.linspace(-5.0, 5.0, 41)


def slope_of(function: Callable[[Array], Array], x: Array, step: Array | float) -> Array:
    """Return the derivative by the central difference of sixth order."""
    parts = [function(x + k * step) - function(x - k * step) for k in (1, 2, 3)]
    return np.asarray((45.0 * parts[0] - 9.0 * parts[1] + parts[2]) / (60.0 * step))


@EACH
def test_the_parameter_is_the_quantile_of_the_normal_probability(prior: ContinuousPrior, law: Any) -> None:
    below, above = -np.abs(MIDDLE), np.abs(MIDDLE)
    np.testing.assert_allclose(prior.from_standard(below).value, law.ppf(special.ndtr(below)), rtol=2e-9)
    np.testing.assert_allclose(prior.from_standard(above).value, law.isf(special.ndtr(-above)), rtol=2e-9)


@EACH
def test_thirty_standard_deviations_out_no_digits_are_lost(prior: ContinuousPrior, law: Any) -> None:
    """The logs of the tail probabilities agree with scipy's own; scipy's inverse itself fails out there."""
    for t in (-30.0, -20.0, 20.0, 30.0):
        x = float(prior.from_standard(t).value)
        low, high = prior.support
        if x in {low, high} or abs(x - low) < 1e-9 * abs(low) or abs(x - high) < 1e-9 * abs(high):
            continue  # nearer to the end than doubles are dense there
        if low == 0.0 and x < 1e-305:
            continue  # no double is as small as the quantile
        tail = law.logcdf(x) if t < 0 else law.logsf(x)
        if np.isfinite(tail) and tail < -1.0:
            np.testing.assert_allclose(tail, special.log_ndtr(-abs(t)), rtol=1e-10)


@EACH
def test_everything_stays_finite_and_inside_out_to_38(prior: ContinuousPrior, law: Any) -> None:
    t = np.linspace(-38.0, 38.0, 1521)
    x, first, second = prior.from_standard(t)
    low, high = prior.support
    assert np.all(np.isfinite(x) & np.isfinite(first) & np.isfinite(second))
    assert np.all((x >= low) & (x <= high))
    assert np.all(np.diff(x) >= 0.0)
    assert np.all(first >= 0.0)


@EACH
def test_the_derivatives_are_those_of_the_parameter(prior: ContinuousPrior, law: Any) -> None:
    x = prior.from_standard(MIDDLE)
    first = slope_of(lambda t: prior.from_standard(t).value, MIDDLE, 0.02)
    second = slope_of(lambda t: prior.from_standard(t).first, MIDDLE, 0.02)
    np.testing.assert_allclose(x.first, first, rtol=1e-7, atol=1e-9 * np.max(x.first))
    np.testing.assert_allclose(x.second, second, rtol=1e-6, atol=1e-8 * np.max(x.first))


@EACH
def test_there_and_back_is_where_one_was(prior: ContinuousPrior, law: Any) -> None:
    back = prior.to_standard(prior.from_standard(MIDDLE[4:-4]).value)
    np.testing.assert_allclose(back, MIDDLE[4:-4], atol=2e-7)


@EACH
def test_the_density_is_the_textbook_one(prior: ContinuousPrior, law: Any) -> None:
    x = prior.from_standard(MIDDLE[10:-10]).value
    np.testing.assert_allclose(prior.ln_density(x), law.logpdf(x), rtol=1e-11, atol=1e-11)


@EACH
def test_nothing_is_outside_the_support(prior: ContinuousPrior, law: Any) -> None:
    low, high = prior.support
    if np.isfinite(low):
        assert prior.ln_density(low - 0.1) == -np.inf
        assert prior.to_standard(low - 0.1) < -37.0
    if np.isfinite(high):
        assert prior.ln_density(high + 0.1) == -np.inf
        assert prior.to_standard(high + 0.1) > 37.0


@EACH
def test_quantiles_and_moments_are_those_of_scipy(prior: ContinuousPrior, law: Any) -> None:
    p = np.array([0.0, 1e-6, 0.05, 0.5, 0.95, 1.0])
    np.testing.assert_allclose(prior.quantile(p), law.ppf(p), rtol=1e-8, atol=1e-300)
    np.testing.assert_allclose(prior.moments, (law.mean(), law.std()), rtol=1e-9)
    np.testing.assert_allclose(prior.median, law.median(), rtol=1e-9)


@EACH
def test_the_penalty_is_the_density_less_a_constant(prior: ContinuousPrior, law: Any) -> None:
    x = prior.from_standard(np.linspace(-2.0, 2.0, 9)).value
    value, first, second = prior.fit_penalty(x)
    in_ln_x = isinstance(prior, LogNormal | LogUniform)
    expected = law.logpdf(x) + (np.log(x) if in_ln_x else 0.0)
    np.testing.assert_allclose(value - value[0], expected - expected[0], atol=1e-9)
    step = 1e-3 * np.minimum(x - prior.support[0], np.minimum(prior.support[1] - x, 1.0))
    np.testing.assert_allclose(
        first, slope_of(lambda y: prior.fit_penalty(y).value, x, step), rtol=1e-6, atol=1e-6
    )
    np.testing.assert_allclose(
        second, slope_of(lambda y: prior.fit_penalty(y).first, x, step), rtol=1e-6, atol=1e-6
    )


def test_the_penalty_is_zero_at_its_largest() -> None:
    assert float(Normal(18.0, 0.5).fit_penalty(18.0).value) == 0.0
    assert float(LogNormal(3.0, 1.4).fit_penalty(3.0).value) == 0.0
    assert float(Gamma(3.0, 2.0).fit_penalty(1.0).value) == pytest.approx(0.0, abs=1e-15)
    assert float(Beta(3.0, 2.0).fit_penalty(2.0 / 3.0).value) == pytest.approx(0.0, abs=1e-15)
    assert float(HalfNormal(2.0).fit_penalty(0.0).value) == 0.0


def test_a_flat_prior_is_a_range_and_nothing_else() -> None:
    assert [prior.is_flat for prior in (Uniform(0, 5), LogUniform(1, 5), Beta(1, 1))] == [True, True, True]
    assert [prior.is_flat for prior in (Normal(0, 5), Beta(1, 2), Exponential(1))] == [False, False, False]
    for prior in (Uniform(0, 5), LogUniform(1, 5), Beta(1, 1, 0, 5)):
        assert all(float(part) == 0.0 for part in prior.fit_penalty(2.0))


@EACH
def test_the_density_integrates_to_one(prior: ContinuousPrior, law: Any) -> None:
    ends = [float(end) for end in prior.quantile([1e-9, 0.5, 1.0 - 1e-9])]
    halves = [
        integrate.quad(lambda x: np.exp(prior.ln_density(x)), *pair, epsrel=1e-9, limit=400)[0]
        for pair in pairwise(ends)
    ]
    assert sum(halves) == pytest.approx(1.0 - 2e-9, abs=1e-7)


@EACH
def test_normal_draws_become_draws_of_the_prior(prior: ContinuousPrior, law: Any) -> None:
    """Kolmogorov and Smirnov's test does not object, and does to the same draws moved by a fifth of an sd."""
    t = np.random.default_rng(20260101).normal(size=4000)
    assert stats.kstest(prior.from_standard(t).value, law.cdf).pvalue > 1e-3
    assert stats.kstest(prior.from_standard(t + 0.2).value, law.cdf).pvalue < 1e-9


def test_scaling_a_prior_scales_its_width() -> None:
    assert Uniform(1.0, 5.0).scaled(0.5) == Uniform(1.0, 3.0)
    assert Normal(18.0, 0.5, low=0.0).scaled(2.0) == Normal(18.0, 1.0, low=0.0)
    assert HalfNormal(2.0).scaled(2.0) == HalfNormal(4.0)
    assert Exponential(2.0).scaled(0.5) == Exponential(1.0)
    assert LogNormal(3.0, 1.44).scaled(0.5) == LogNormal(3.0, 1.2)
    assert LogNormal(3.0, 1.2).scaled(2.0) == LogNormal(3.0, 1.44)
    for prior in (LogUniform(1.0, 2.0), Beta(2.0, 2.0), Fixed(1.0)):
        assert prior.scaled(2.0) is None


def test_a_scaled_gamma_keeps_its_mean() -> None:
    wide = Gamma(4.0, 2.0).scaled(2.0)
    assert wide is not None
    assert wide.moments == pytest.approx((2.0, 2.0))


def test_the_moments_after_a_cut_are_not_those_of_the_whole_normal() -> None:
    """The standard half normal has mean sqrt(2/pi) and sd sqrt(1 - 2/pi) (Johnson, Kotz and Balakrishnan)."""
    half = (np.sqrt(2.0 / np.pi), np.sqrt(1.0 - 2.0 / np.pi))
    assert Normal(0.0, 1.0, low=0.0).moments == pytest.approx(half, rel=1e-10)
    assert HalfNormal(1.0).moments == pytest.approx(half, rel=1e-14)
    assert Normal(0.0, 1.0, low=0.0).sd == 1.0


def test_a_held_parameter_has_a_value_and_no_coordinate() -> None:
    held = Fixed(3.0)
    assert (held.mean, held.sd, held.median, held.support) == (3.0, 0.0, 3.0, (3.0, 3.0))
    with pytest.raises(ValueError, match="no standard coordinate"):
        held.from_standard(0.0)
    with pytest.raises(ValueError, match="no standard coordinate"):
        held.to_standard(3.0)


def test_the_families_bear_the_names_of_the_file() -> None:
    assert set(FAMILIES) == {
        "uniform", "normal", "lognormal", "gamma", "exponential", "halfnormal", "loguniform", "beta", "fixed",
    }  # fmt: skip
    assert all(family.family == name for name, family in FAMILIES.items())


def test_the_words_for_screens() -> None:
    assert Uniform(0.0, 5.0).text() == "uniform from 0 to 5"
    assert Normal(18.0, 0.5).text() == "normal 18 ± 0.5"
    assert Normal(18.0, 0.5, low=0.0).text() == "normal 18 ± 0.5 from 0"
    assert LogNormal(3.0, 1.2).text() == "log-normal with median 3, times or over 1.2"
    assert Fixed(45.0).text() == "fixed at 45"
