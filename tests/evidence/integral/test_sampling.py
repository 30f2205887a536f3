"""The sampling pass: right within its own error, whose size is right; and what is wrong shows."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import numpy.typing as npt
import pytest
from scipy import special

from tests.evidence.brute_force import ln_evidence, standard_normal, under
from tests.evidence.small_analyses import TAU, YIELD, bump, counting, several_bins, source, templates
from tests.evidence.wrong_proposal import Wrong
from workbench.evidence.formulas import closed_forms
from workbench.evidence.integral import sampling
from workbench.evidence.integral.pareto import largest_allowed
from workbench.evidence.integral.proposal import propose
from workbench.evidence.integral.quadrature import Grid, integrate
from workbench.evidence.integral.sampling import SCRAMBLES, Sample, sample
from workbench.evidence.weigh import weigh, weigh_hypothesis
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.priors import Exponential, Gamma, Uniform
from workbench.likelihood.model import compile_model

Array = npt.NDArray[np.float64]

SIGNAL = "signal plus background"
LEVEL = Gamma(shape=1.5, rate=0.1)
EDGES = np.linspace(0.0, 20.0, 41)
CONTINUUM: Array = 400.0 * -np.diff(np.exp(-EDGES / 8.0)) / -np.expm1(-20.0 / 8.0)


def grid_of(analysis: Analysis, hypothesis: str = SIGNAL) -> Grid:
    model = compile_model(analysis, hypothesis)
    assert model.observed is not None
    grid = integrate(model, model.observed)
    assert grid is not None
    return grid


def on_off() -> tuple[Grid, float]:
    """Return on/off counts with the exact ln evidence of signal plus background."""
    exact = closed_forms.ln_on_off_signal(8, 14, TAU, (LEVEL.shape, LEVEL.rate), (1.0, 1.0 / YIELD))
    return grid_of(counting(8, LEVEL, Exponential(1.0), control=14)), exact


def with_sources() -> tuple[Grid, float]:
    """Return templates with two sources, and their ln evidence by brute force."""
    region = several_bins(
        "r", [14.0, 22.0, 9.0], {"background": [10.0, 15.0, 8.0], "signal": [1.0, 6.0, 2.0]}
    )
    sources = (source("size", background=0.3), source("shape", background=0.1, signal=(0.4, -0.2)))
    grid = grid_of(templates(region, Exponential(1.0), sources))
    rules = {
        "strength": under(Exponential(1.0), *np.linspace(0.0, 6.0, 5), 20.0, nodes=12),
        "size": standard_normal(8),
        "shape": standard_normal(12),
    }
    return grid, ln_evidence(grid.integrand.model, rules)


def peaked() -> tuple[Grid, float]:
    """Return a bump of unknown mass, and its ln evidence by brute force."""
    counts = np.round(CONTINUUM + 15.0 * np.diff(special.ndtr((EDGES - 7.0) / 0.4)))
    grid = grid_of(bump(counts))
    rules = {
        "strength": under(Uniform(0.0, 5.0), *np.linspace(0.0, 5.0, 5), nodes=12),
        "mass": under(Uniform(1.0, 19.0), *np.linspace(1.0, 19.0, 37), nodes=6),
    }
    return grid, ln_evidence(grid.integrand.model, rules)


CASES = {"on and off counts": on_off, "two sources": with_sources, "unknown mass": peaked}


def samples(grid: Grid, number: int, draws: int = 64) -> list[Sample]:
    return [sample(grid, np.random.SeedSequence(seed), draws) for seed in range(number)]


@pytest.mark.parametrize("case", CASES.values(), ids=CASES)
def test_estimates_are_right_and_their_errors_of_the_right_size(case: object) -> None:
    """Pulls over 100 seeds: no shift, and the mean square of t-like pulls with 15 degrees of freedom."""
    assert callable(case)
    grid, exact = case()
    pulls = np.array([(one.ln_evidence - exact) / one.error for one in samples(grid, 100)])
    assert abs(pulls.mean()) < 4.0 * pulls.std() / 10.0
    # 15/13 for honest errors; smaller where the least share of independent draws is quoted instead.
    assert 0.05 < np.mean(pulls**2) < 1.8
    assert np.abs(pulls).max() < 6.0


def test_more_draws_make_the_error_smaller() -> None:
    grid, _ = with_sources()
    few, many = (np.mean([one.error for one in samples(grid, 10, draws)]) for draws in (64, 1024))
    assert few / many > 3.0


def test_a_proposal_with_a_wrong_normalisation_is_seen(monkeypatch: pytest.MonkeyPatch) -> None:
    """The negative control: density a twentieth too high: the pulls' mean is far from 0."""
    grid, exact = on_off()
    monkeypatch.setattr(sampling, "propose", lambda given: Wrong(propose(given), 0.05))
    pulls = np.array([(one.ln_evidence - exact) / one.error for one in samples(grid, 40)])
    assert abs(pulls.mean()) > 8.0 * pulls.std() / np.sqrt(40.0)


def test_a_proposal_with_a_very_wrong_normalisation_is_not_established(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    """One run alone: the other estimator disagrees."""
    analysis = counting(8, LEVEL, Exponential(1.0), control=14)
    model = compile_model(analysis, SIGNAL)
    monkeypatch.setattr(sampling, "propose", lambda given: Wrong(propose(given), 0.3))
    evidence = weigh_hypothesis(model, np.random.SeedSequence(1), closed_forms=False).evidence
    assert not evidence.established
    assert "quadrature and sampling differ" in evidence.reason


def two_peaks() -> Grid:
    """Return a grid of which each of two masses holds a good part."""
    peaks = sum(
        size * np.diff(special.ndtr((EDGES - mass) / 0.4)) for mass, size in ((5.0, 40.0), (15.0, 24.0))
    )
    return grid_of(bump(np.round(CONTINUUM + peaks)))


def blinded(grid: Grid) -> Grid:
    """Return the grid with everything above a mass of 10 taken for nothing: its second mode missed."""
    low = grid.axes[0].nodes < 0.5
    height = np.where(low[:, None], grid.columns.ln_height, grid.columns.ln_height.max() - 500.0)
    integrals = replace(grid.columns, ln_height=height).ln_integral()
    total = float(special.logsumexp(integrals, b=grid.axes[0].weights))
    return replace(grid, columns=replace(grid.columns, ln_height=height), ln_evidence=total)


def is_doubted(found: Sample, grid: Grid) -> bool:
    gap = abs(found.ln_evidence - grid.ln_evidence)
    return bool(
        found.error > 0.1
        or found.k_hat > largest_allowed(found.ln_weights.size)
        or gap > 0.05 + 3.0 * np.hypot(found.error, grid.error)
    )


def test_a_mode_that_the_search_missed_shows_in_the_weights() -> None:
    """Some draws are the prior's: the few that find the other mode dominate, and the estimate is in doubt."""
    whole = two_peaks()
    blind = blinded(whole)
    assert 0.3 < whole.ln_evidence - blind.ln_evidence < 3.0
    for seed in range(8):
        child = np.random.SeedSequence(seed)
        assert is_doubted(sample(blind, child, 512), blind)
        assert not is_doubted(sample(whole, child, 64), whole)


def test_weighted_draws_are_a_posterior_sample() -> None:
    """Mean and spread of the strength against brute force, within their own errors."""
    grid, _ = on_off()
    model = grid.integrand.model
    found = sample(grid, np.random.SeedSequence(5), 1024)
    strength = model.seeds(found.points).x[model.names.index("strength")]
    weight = np.exp(found.ln_weights - found.ln_weights.max())
    weight /= weight.sum()
    mean = weight @ strength
    spread = np.sqrt(weight @ (strength - mean) ** 2)
    x, w = under(Exponential(1.0), *np.linspace(0.0, 6.0, 7), nodes=8)
    curve = np.array([strength_density(value) for value in x]) * w
    exact = curve @ x / curve.sum()
    exact_spread = np.sqrt(curve @ (x - exact) ** 2 / curve.sum())
    error = spread * np.sqrt((weight**2).sum())  # as if draws were independent: an upper bound here
    assert abs(mean - exact) < 4.0 * error
    assert abs(spread - exact_spread) < 4.0 * error
    plain = strength.mean()
    assert abs(plain - exact) > 4.0 * error, "the negative control: without weights it is another law"


def strength_density(strength: float) -> float:
    """Return the likelihood of the on and off counts at a strength, the background integrated."""
    rule, weights = under(LEVEL, *np.linspace(0.0, 40.0, 41), nodes=6)
    on = 8.0 * np.log(rule + YIELD * strength) - rule - YIELD * strength
    off = 14.0 * np.log(TAU * rule) - TAU * rule
    return float(weights @ np.exp(on + off - 10.0))


def test_one_seed_gives_one_sample_bit_for_bit() -> None:
    grid, _ = on_off()
    first, again, other = (sample(grid, np.random.SeedSequence(s), 64) for s in (3, 3, 4))
    assert first.ln_evidence == again.ln_evidence
    assert (first.points == again.points).all()
    assert (first.ln_weights == again.ln_weights).all()
    assert first.ln_evidence != other.ln_evidence
    assert first.ln_weights.size % SCRAMBLES == 0


def test_the_error_reported_is_reached_with_more_draws_where_the_first_are_too_few() -> None:
    """Weighing draws again until an error of 0.005."""
    (_, evidence) = weigh(bump(np.round(CONTINUUM), uncertainties=(source("size", continuum=0.3),))).evidences
    assert evidence.error is not None
    assert evidence.error <= 0.005


@pytest.mark.parametrize("shape", [0.45, 0.65])
def test_an_error_grows_with_the_weight_of_the_tail_it_was_told_by(shape: float) -> None:
    """Weights u^-k of uniform u have the mean 1/(1 - k), and from k = 1/2 no variance.

    Their spread alone tells too small an error. 400 repeats: the root mean square of pulls has an error of
    0.05 or so where they are nearly normal.
    """
    generator = np.random.default_rng(3)
    grown, plain = [], []
    for _ in range(400):
        found = sampling._summary(np.zeros((2048, 1)), -shape * np.log(generator.random(2048)))
        pull = (found.ln_evidence + np.log(1.0 - shape)) / found.error
        grown.append(pull)
        plain.append(pull * (1.0 + 3.0 * min(max(found.k_hat - 0.25, 0.0), 1.0)))
    assert 0.7 < np.sqrt(np.mean(np.square(grown))) < 1.2
    assert np.sqrt(np.mean(np.square(plain))) > 1.15
