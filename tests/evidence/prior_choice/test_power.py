"""Priors to a power, and the distance that power-scaling is told by."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest
from scipy import integrate, stats

from workbench.evidence.prior_choice.distance import cumulative_distance
from workbench.evidence.prior_choice.power import powered
from workbench.hypotheses.priors import (
    Beta,
    Exponential,
    Gamma,
    HalfNormal,
    LogNormal,
    LogUniform,
    Normal,
    Prior,
    Uniform,
)

Array = npt.NDArray[np.float64]

PRIORS: list[tuple[Prior, float, float]] = [
    (Normal(1.0, 0.5), -6.0, 8.0),
    (Normal(1.0, 0.5, low=0.2, high=1.9), 0.2, 1.9),
    (HalfNormal(2.0), 0.0, 40.0),
    (Exponential(1.5), 0.0, 90.0),
    (Gamma(3.0, 2.0), 0.0, 40.0),
    (Gamma(0.8, 2.0), 1e-12, 40.0),
    (Beta(2.0, 3.0, -1.0, 2.0), -1.0, 2.0),
]


@pytest.mark.parametrize("power", [0.5, 2.0])
@pytest.mark.parametrize(("prior", "low", "high"), PRIORS, ids=[prior.text() for prior, *_ in PRIORS])
def test_a_powered_prior_is_the_density_to_that_power_normalised(
    prior: Prior, low: float, high: float, power: float
) -> None:
    other = powered(prior, power)
    assert other is not None
    norm, _ = integrate.quad(
        lambda x: float(np.exp(power * prior.ln_density(x))), low, high, epsrel=1e-10, limit=400
    )
    for share in (0.2, 0.5, 0.9):
        x = float(prior.quantile(share))
        expected = power * float(prior.ln_density(x)) - np.log(norm)
        assert float(other.ln_density(x)) == pytest.approx(expected, abs=2e-5)


def test_a_lognormal_is_raised_in_ln_x() -> None:
    """By hand: ln x normal around ln 3 with half the variance."""
    assert powered(LogNormal(3.0, 2.0), 2.0) == LogNormal(3.0, 2.0**0.5**0.5)


def test_flat_priors_and_those_that_would_be_improper_have_no_power() -> None:
    for prior in (Uniform(0.0, 1.0), LogUniform(1.0, 2.0), Beta(1.0, 1.0)):
        assert powered(prior, 2.0) is None
    assert powered(Gamma(0.4, 1.0), 2.0) is None
    assert powered(Gamma(0.4, 1.0), 0.5) is not None


def quantiles(draws: int) -> Array:
    return np.asarray(stats.norm.ppf((np.arange(draws) + 0.5) / draws))


def weights(x: Array, mean: float, sd: float) -> Array:
    return np.asarray(stats.norm.pdf(x, mean, sd) / stats.norm.pdf(x))


def dense(mean: float, sd: float) -> float:
    """The same distance from distribution functions on a dense grid, over scipy's own normal law."""
    x = np.linspace(float(stats.norm.ppf(1 / 4000)), float(stats.norm.ppf(1 - 1 / 4000)), 200_001)
    p, q = stats.norm.cdf(x), stats.norm.cdf(x, mean, sd)

    def one_way(a: Array, b: Array) -> float:
        middle = 0.5 * (a + b)
        inner = np.trapezoid(a * np.log2(a / middle) + b * np.log2(b / middle), x)
        return float(inner / np.trapezoid(a + b, x))

    return float(np.sqrt(max(one_way(p, q), one_way(1.0 - p, 1.0 - q))))


@pytest.mark.parametrize(("mean", "sd"), [(0.3, 1.0), (-0.3, 1.0), (0.0, 1.3), (0.02, 1.0), (1.0, 0.7)])
def test_a_distance_is_that_of_the_distribution_functions(mean: float, sd: float) -> None:
    x = quantiles(8000)
    found = cumulative_distance(x, np.ones(8000), weights(x, mean, sd))
    assert found == pytest.approx(dense(mean, sd), rel=0.03)


def test_a_distance_keeps_the_published_rule_of_thumb() -> None:
    """0.05 per doubling is about a shift of 0.3 standard deviations: Kallioinen et al., from memory."""
    assert 0.05 < dense(0.3, 1.0) < 0.08


def test_equal_weights_are_no_distance_apart_and_mirrored_ones_the_same() -> None:
    x = quantiles(2000)
    assert cumulative_distance(x, np.ones(2000), np.full(2000, 3.0)) == 0.0
    right = cumulative_distance(x, np.ones(2000), weights(x, 0.4, 1.0))
    left = cumulative_distance(x, np.ones(2000), weights(x, -0.4, 1.0))
    assert right == pytest.approx(left, rel=0.02)


def test_draws_without_weight_far_away_change_nothing() -> None:
    x = quantiles(4000)
    after = weights(x, 0.3, 1.0)
    alone = cumulative_distance(x, np.ones(4000), after)
    far = np.concatenate([x, [-900.0, 900.0, 5000.0]])
    flat, tilted = np.append(np.ones(4000), np.zeros(3)), np.append(after, np.zeros(3))
    assert cumulative_distance(far, flat, tilted) == pytest.approx(alone)
