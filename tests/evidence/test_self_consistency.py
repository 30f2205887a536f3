"""What must hold over pseudo-experiments drawn from the signal hypothesis, whatever the analysis.

E[B01] = 1 when counts come from the signal hypothesis' prior predictive: sum over n of p1(n) p0(n)/p1(n) = 1.
In this direction B is bounded, so that an ensemble settles; in the other its variance may be infinite.

Where the true strength stands among posterior draws of it is uniform.

Sources:
    I.J. Good, Good Thinking (1983), attributing the first to A.M. Turing; from memory.
    S. Talts et al., Validating Bayesian inference algorithms with simulation-based calibration,
    arXiv:1804.06788; from memory.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import numpy.typing as npt
import pytest
from scipy import stats

from tests.evidence.small_analyses import bump, counting, several_bins, source, templates
from workbench.ensembles.drawing import draw_counts, draw_parameters
from workbench.evidence import exact
from workbench.evidence.integral.quadrature import integrate
from workbench.evidence.integral.sampling import sample
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.priors import Exponential, Gamma
from workbench.likelihood.model import Model, compile_model

Array = npt.NDArray[np.float64]
LnEvidence = Callable[[Model, Array], float]

SIGNAL = "signal plus background"
RANKS = 10


def on_off() -> Analysis:
    return counting(5, Gamma(shape=4.0, rate=1.0), Exponential(1.0), control=16)


def with_sources() -> Analysis:
    region = several_bins(
        "r", [14.0, 22.0, 9.0], {"background": [10.0, 15.0, 8.0], "signal": [1.0, 6.0, 2.0]}
    )
    return templates(region, Exponential(1.0), (source("size", background=0.15), source("yield", signal=0.1)))


def with_a_mass() -> Analysis:
    return bump(np.zeros(16), bins=16, resolution=0.8, continuum=40.0, strength=Exponential(1.0))


def pseudo_experiments(analysis: Analysis, number: int, seed: int) -> tuple[Model, Model, Array, Array]:
    """Return both models, (draw, coordinate) true values of the signal hypothesis and (draw, bin) counts."""
    generator = np.random.default_rng(seed)
    model = compile_model(analysis, SIGNAL)
    values = draw_parameters(model, generator, number)
    counts = draw_counts(model, values, generator)
    return compile_model(analysis, "background only"), model, values, counts


def closed(model: Model, counts: Array) -> float:
    rates = exact.linear_rates(model)
    assert rates is not None
    found = exact.ln_evidence(rates, counts)
    assert found is not None
    return found


def by_quadrature(model: Model, counts: Array) -> float:
    if model.size == 0:
        return float(model.ln_likelihood(model.seeds(np.zeros((1, 0))), counts)[0])
    grid = integrate(model, counts)
    assert grid is not None
    return grid.ln_evidence


def bayes_factors(analysis: Analysis, ln_evidence: LnEvidence, number: int, seed: int) -> Array:
    """Return B01 of pseudo-experiments drawn from the signal hypothesis."""
    background, signal, _, counts = pseudo_experiments(analysis, number, seed)
    return np.array([np.exp(ln_evidence(background, row) - ln_evidence(signal, row)) for row in counts])


def assert_mean_is_one(factors: Array) -> None:
    error = factors.std(ddof=1) / np.sqrt(factors.size)
    assert error < 0.09
    assert abs(factors.mean() - 1.0) < 4.0 * error


def test_the_mean_of_b01_is_one_in_closed_form() -> None:
    assert_mean_is_one(bayes_factors(on_off(), closed, 1500, seed=21))


@pytest.mark.parametrize("analysis", [on_off, with_sources, with_a_mass], ids=["on-off", "sources", "mass"])
def test_the_mean_of_b01_is_one_by_quadrature(analysis: Callable[[], Analysis]) -> None:
    assert_mean_is_one(bayes_factors(analysis(), by_quadrature, 400, seed=22))


def test_a_broken_evidence_has_another_mean() -> None:
    """The negative control: a strength's prior half as wide again as the one that counts came from."""
    right, wide = on_off(), counting(5, Gamma(shape=4.0, rate=1.0), Exponential(1.5), control=16)
    background, signal, _, counts = pseudo_experiments(right, 1500, seed=21)
    other = compile_model(wide, SIGNAL)
    assert other.names == signal.names
    factors = np.array([np.exp(closed(background, row) - closed(other, row)) for row in counts])
    error = factors.std(ddof=1) / np.sqrt(factors.size)
    assert abs(factors.mean() - 1.0) > 5.0 * error


def ranks_of_the_truth(analysis: Analysis, number: int, seed: int, told: float = 1.0) -> Array:
    """Return (draw,) shares of the posterior below the true strength.

    Args:
        analysis: what pseudo-experiments are drawn from.
        number: how many.
        seed: where the random numbers come from.
        told: factor on the expected events when counts are drawn; 1 is honest.
    """
    _, model, values, _ = pseudo_experiments(analysis, number, seed)
    generator = np.random.default_rng(seed + 1)
    expected = model.expected(model.natural_seeds(values))[0]
    place = model.names.index("strength")
    found = np.empty(number)
    for index, counts in enumerate(generator.poisson(told * expected).astype(float)):
        grid = integrate(model, counts)
        assert grid is not None
        drawn = sample(grid, np.random.SeedSequence((seed, index)), 64)
        strength = model.seeds(drawn.points).x[place]
        weight = np.exp(drawn.ln_weights - drawn.ln_weights.max())
        found[index] = weight[strength < values[index, place]].sum() / weight.sum()
    return found


@pytest.mark.parametrize("analysis", [on_off, with_sources, with_a_mass], ids=["on-off", "sources", "mass"])
def test_the_true_strength_stands_anywhere_among_weighted_posterior_draws(
    analysis: Callable[[], Analysis],
) -> None:
    """Chi-square of 200 ranks in 10 bins: passed by chance but once in ten thousand times."""
    ranks = ranks_of_the_truth(analysis(), 200, seed=31)
    counted = np.histogram(ranks, bins=RANKS, range=(0.0, 1.0))[0]
    assert stats.chisquare(counted).pvalue > 1e-4
    assert stats.kstest(ranks, "uniform").pvalue > 1e-4


def test_counts_that_are_not_those_of_the_hypothesis_push_the_ranks_aside() -> None:
    """The negative control: three tenths more events than the hypothesis says."""
    ranks = ranks_of_the_truth(with_sources(), 200, seed=31, told=1.3)
    assert stats.kstest(ranks, "uniform").pvalue < 1e-4
