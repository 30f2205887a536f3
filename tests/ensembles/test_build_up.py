"""The build-up of evidence against brute-force sums that share no code with the engine."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import numpy.typing as npt
import pytest
from scipy import integrate, special, stats

from tests.evidence.small_analyses import YIELD, counting, source
from workbench.ensembles.adequacy import adequacy
from workbench.ensembles.build_up import BuildUp, build_up, build_up_steps
from workbench.ensembles.toys import Toy, toy
from workbench.errors import InputError
from workbench.evidence.weigh import weigh
from workbench.hypotheses.analysis import Exposure
from workbench.hypotheses.file.reading import read_analysis
from workbench.hypotheses.priors import Exponential

Array = npt.NDArray[np.float64]
DATA = Path(__file__).parents[2] / "data"
KNOWN = 3.0
STEPS = [0.2, 0.5, 1.0, 1.6, 2.0, 3.0, 4.5]
SIZE = 0.2


def experiment(*, is_uncertain: bool, seed: int = 2) -> Toy:
    sources = (source("size", background=SIZE),) if is_uncertain else ()
    scenario = counting(0.0, KNOWN, Exponential(1.0), uncertainties=sources)
    scenario = replace(scenario, exposure=Exposure(1.0, "year"))
    return toy(scenario, true={"strength": 0.8}, seed=seed)


def ln_b(found: BuildUp) -> Array:
    name = found.steps[0].comparisons[0].hypothesis
    return np.array([one.ln_bayes_factor for one in found.of(name)])


def brute(count: float, exposure: float) -> float:
    """Return ln B of one bin by scipy's quad, background known, strength exponential of mean 1."""
    law = stats.poisson(exposure * KNOWN).pmf(count)

    def ratio(s: float) -> float:
        return float(stats.poisson(exposure * (KNOWN + YIELD * s)).pmf(count) / law * np.exp(-s))

    best = max((count / exposure - KNOWN) / YIELD, 0.0)
    return float(np.log(integrate.quad(ratio, 0.0, 30.0, points=[best, best + 0.3], limit=500)[0]))


def test_each_step_is_the_bayes_factor_of_all_counts_so_far() -> None:
    one = experiment(is_uncertain=False)
    counts = [float(one.counts(x).sum()) for x in STEPS]
    found = build_up(one.at, STEPS, pseudo_experiments=0)
    assert [step.events for step in found.steps] == counts
    assert found.unit == "year"
    np.testing.assert_allclose(ln_b(found), [brute(*at) for at in zip(counts, STEPS, strict=True)], atol=1e-8)


def test_steps_are_the_chain_rule_and_no_product_of_fresh_bayes_factors() -> None:
    """Each period's predictive probability is summed on a grid of strengths that it then updates."""
    one = experiment(is_uncertain=False)
    counts = np.array([one.counts(x).sum() for x in STEPS])
    strength = (np.arange(200_000) + 0.5) * 25.0 / 200_000
    weights = np.exp(-strength)
    weights /= weights.sum()
    chained, fresh = [], []
    for count, width in zip(np.diff(counts, prepend=0.0), np.diff(STEPS, prepend=0.0), strict=True):
        likelihood = stats.poisson(width * (KNOWN + YIELD * strength)).pmf(count)
        background = stats.poisson(width * KNOWN).logpmf(count)
        chained.append(np.log((weights * likelihood).sum()) - background)
        weights = weights * likelihood / (weights * likelihood).sum()
        fresh.append(brute(float(count), float(width)))
    found = ln_b(build_up(one.at, STEPS, pseudo_experiments=0))
    np.testing.assert_allclose(found, np.cumsum(chained), atol=1e-6)
    assert abs(found[-1] - np.sum(fresh)) > 0.5  # the negative control: the prior set back each time


def likelihood_of(strength: Array, count: float, exposure: float) -> tuple[Array, float]:
    """Return the marginal likelihood of strengths and of none, the background's size summed over."""
    z, weights = special.roots_hermitenorm(60)
    size = KNOWN * (1.0 + SIZE) ** z
    each = stats.poisson(exposure * (size[:, None] + YIELD * strength)).pmf(count)
    none = stats.poisson(exposure * size).pmf(count)
    total = weights.sum()
    return weights @ each / total, float(weights @ none / total)


def test_uncertain_backgrounds_agree_with_brute_force_within_the_stated_errors() -> None:
    one = experiment(is_uncertain=True)
    found = build_up(one.at, STEPS, pseudo_experiments=0)
    strength = np.linspace(0.0, 25.0, 50_001)
    for step, exposure in zip(found.steps, STEPS, strict=True):
        above, none = likelihood_of(strength, float(one.counts(exposure).sum()), exposure)
        density = above * np.exp(-strength)
        (comparison,) = step.comparisons
        assert comparison.established
        assert comparison.ln_bayes_factor is not None
        assert comparison.ln_bayes_factor_error is not None
        exact = np.log(integrate.trapezoid(density, strength) / none)
        assert abs(comparison.ln_bayes_factor - exact) < 4.0 * comparison.ln_bayes_factor_error
        cumulative = integrate.cumulative_trapezoid(density, strength, initial=0.0)
        quantiles = np.interp(special.ndtr([0.0, -1.0, 1.0]), cumulative / cumulative[-1], strength)
        (estimate,) = step.strengths
        values = np.array([estimate.median, estimate.low, estimate.high])
        errors = np.array([estimate.median_error, estimate.low_error, estimate.high_error])
        assert (np.abs(values - quantiles) < 4.5 * errors + 2e-4).all()
        assert (errors < 0.03 * (estimate.high - estimate.low)).all()
        # Negative control: with twice the exposure the same counts say something else.
        other = likelihood_of(strength, step.events, 2.0 * exposure)
        wrong = np.log(integrate.trapezoid(other[0] * np.exp(-strength), strength) / other[1])
        assert abs(comparison.ln_bayes_factor - wrong) > 8.0 * comparison.ln_bayes_factor_error


def test_posterior_odds_are_prior_odds_times_the_accumulated_bayes_factor() -> None:
    one = experiment(is_uncertain=True)
    first, second = one.analysis.hypotheses
    unequal = replace(one.analysis, hypotheses=(replace(first, prior=9.0), replace(second, prior=1.0)))
    found = build_up(toy(unequal, true={"strength": 0.8}, seed=2).at, STEPS, pseudo_experiments=0)
    for step in found.steps:
        (comparison,) = step.comparisons
        assert comparison.ln_bayes_factor is not None
        assert comparison.posterior_odds == pytest.approx(np.exp(comparison.ln_bayes_factor) / 9.0)
        assert step.posteriors[1].prior == pytest.approx(0.1)


def test_posterior_probabilities_mean_what_they_say_at_every_exposure() -> None:
    """Hypothesis and parameters drawn from their priors: the mean posterior probability is the prior's.

    By the law of total expectation, at every exposure at which one looks. Tolerance: the mean's standard
    error.
    """
    sorrel = read_analysis(DATA / "sorrel" / "sorrel.toml")
    names = [one.name for one in sorrel.hypotheses]
    runs, exposures = 600, [0.8, 3.2, 6.4]
    true = np.random.default_rng(17).integers(0, 2, runs)
    toys = [toy(sorrel, hypothesis=names[k], seed=seed) for seed, k in enumerate(true)]
    found = np.array([probabilities(one, exposures) for one in toys])
    error = found.std(axis=0) / np.sqrt(runs)
    assert (np.abs(found.mean(axis=0) - 0.5) < 4.0 * error).all()
    for place, at in enumerate(exposures):  # and among those called likely, as many hold as is said
        likely = found[:, place] > 0.6
        assert likely.sum() > 50, at
        spread = np.sqrt((found[likely, place] * (1.0 - found[likely, place])).sum()) / likely.sum()
        assert abs(true[likely].mean() - found[likely, place].mean()) < 4.0 * spread
    # Negative control: signals of a tenth of the prior's mean are called likely too seldom.
    weak = [toy(sorrel, hypothesis=names[k], true={"strength": 0.1} if k else {}, seed=seed)
            for seed, k in enumerate(true)]  # fmt: skip
    other = np.array([probabilities(one, exposures[-1:]) for one in weak])
    assert abs(other.mean() - 0.5) > 6.0 * other.std() / np.sqrt(runs)


def probabilities(one: Toy, exposures: list[float]) -> list[float]:
    """Return the posterior probability of the second hypothesis at each exposure."""
    steps = [weigh(one.at(exposure)).posteriors[1].probability for exposure in exposures]
    assert None not in steps
    return [float(p) for p in steps if p is not None]


def test_steps_come_one_by_one_and_go_on_from_those_before() -> None:
    skerry = read_analysis(DATA / "skerry" / "skerry.toml")
    one = toy(skerry, true={"strength": 1.2, "mass": 45.0}, seed=5)
    exposures = [4.0, 12.0, 24.0]
    seen = list(build_up_steps(one.at, exposures, pseudo_experiments=0))
    assert [[step.exposure for step in part.steps] for part in seen] == [[4.0], [4.0, 12.0], exposures]
    assert seen[-1] == build_up(one.at, exposures, pseudo_experiments=0)
    *_, later = build_up_steps(one.at, [30.0], pseudo_experiments=0, before=seen[-1])
    assert later.steps[:3] == seen[-1].steps
    for step in later.steps:  # started elsewhere, each weighs the same
        (warm,), (cold,) = step.comparisons, weigh(one.at(step.exposure), seed=9).comparisons
        assert warm.established
        assert warm.ln_bayes_factor is not None
        assert cold.ln_bayes_factor is not None
        error = np.hypot(warm.ln_bayes_factor_error or 0.0, cold.ln_bayes_factor_error or 0.0)
        assert abs(warm.ln_bayes_factor - cold.ln_bayes_factor) < 4.0 * error


def test_adequacy_of_each_step_is_that_of_its_counts() -> None:
    one = experiment(is_uncertain=True, seed=4)
    found = build_up(one.at, [1.0, 6.0], seed=3, pseudo_experiments=200)
    for step in found.steps:
        analysis = one.at(step.exposure)
        stated = tuple(adequacy(analysis, each.name, seed=3, most=200) for each in analysis.hypotheses)
        assert step.adequacies == stated
    assert build_up(one.at, [1.0], pseudo_experiments=0).steps[0].adequacies == ()


def test_alternatives_of_backgrounds_are_averaged_at_every_step() -> None:
    dunlin = read_analysis(DATA / "dunlin" / "dunlin.toml")
    one = toy(dunlin, true={"strength": 1.0}, seed=5)
    (step,) = build_up(one.at, [3.0], seed=2, pseudo_experiments=0).steps
    assert step.evidences == weigh(one.at(3.0), seed=2).evidences
    (estimate,) = step.strengths
    assert estimate.alternative in {part.name for part in step.evidences[1].alternatives}


@pytest.mark.parametrize("exposures", [[2.0, 1.0], [1.0, 1.0]])
def test_exposures_that_do_not_ascend_are_refused(exposures: list[float]) -> None:
    with pytest.raises(InputError, match="don't ascend"):
        build_up(experiment(is_uncertain=False).at, exposures)
