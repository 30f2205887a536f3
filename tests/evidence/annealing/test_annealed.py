"""Drawn populations: right within their own error, whose size is right; and what is wrong shows."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import numpy as np
import numpy.typing as npt
import pytest

from tests.evidence.brute_force import ln_evidence, standard_normal, under
from tests.evidence.gaussian_terrains import bells, ridge
from tests.evidence.small_analyses import TAU, YIELD, counting, several_bins, source, templates
from workbench.evidence.annealing import moves
from workbench.evidence.annealing.annealed import (
    POPULATIONS,
    anneal,
    disagreement,
    most_evaluations,
    terrain_of,
)
from workbench.evidence.annealing.moves import Dice, Rung, Terrain
from workbench.evidence.annealing.populations import ascend, next_change, scout
from workbench.evidence.drawn import Drawn, widened
from workbench.evidence.formulas import closed_forms, count_mixtures
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.priors import Exponential, Gamma, Prior, Uniform
from workbench.likelihood.model import compile_model

Array = npt.NDArray[np.float64]

SIGNAL = "signal plus background"


def of(analysis: Analysis, hypothesis: str, seed: int = 1) -> Drawn:
    model = compile_model(analysis, hypothesis)
    assert model.observed is not None
    return anneal(terrain_of(model, model.observed), np.random.SeedSequence(seed))


def agrees(found: Drawn, exact: float) -> bool:
    """Tell whether an answer is without doubt and within 5 of its errors; 1 in 7,000 times it is not."""
    return not found.doubt and abs(found.ln_evidence - exact) < 5.0 * found.error


# Gaussian integrals.


@pytest.mark.parametrize(
    ("terrain", "exact"),
    [
        bells(1, (1.0, 0.5, 0.7)),
        bells(3, (1.0, 2.0, 0.01)),
        bells(12, (1.0, 0.5, 0.2)),
        bells(1, (1.0, -4.0, 1e-4)),
        ridge(6, 0.02),
        bells(2, (0.5, 2.0, 0.05), (0.5, -2.0, 0.05)),
        bells(3, (0.9, (-1.0, 0.5, 0.0), 0.3), (0.1, (1.5, -1.0, 1.0), 0.03)),
        bells(2, (0.3, (0.0, 2.0), 0.02), (0.3, (2.0, 0.0), 0.05), (0.4, (-1.0, -1.0), 0.1)),
    ],
    ids=["wide", "narrow", "twelve", "far out", "ridge", "mirror modes", "a narrow mode", "three modes"],
)
def test_gaussian_integrals_are_found(terrain: Terrain, exact: float) -> None:
    found = anneal(terrain, np.random.SeedSequence(2))
    assert agrees(found, exact)
    assert found.error < 0.03


def test_a_likelihood_that_spans_a_billion_nats_is_climbed() -> None:
    """ln L from -1e9 at typical prior draws: the first powers are tiny."""
    terrain, exact = bells(2, (1.0, 1.0, 2e-5))
    assert agrees(anneal(terrain, np.random.SeedSequence(2)), exact)


def test_a_likelihood_that_most_of_the_prior_forbids_is_integrated() -> None:
    """Impossible left of 2: the evidence is the prior's tail there, 0.02275."""
    terrain = replace(
        bells(1, (1.0, 0.0, 1.0))[0], ln_likelihood=lambda x: np.where(x[:, 0] > 2.0, 0.0, -np.inf)
    )
    assert agrees(anneal(terrain, np.random.SeedSequence(2)), float(np.log(0.022750131948179)))


# Counts whose evidence has a closed form, or is summed by brute force.


@pytest.mark.parametrize(("n_on", "n_off"), [(0, 0), (8, 14), (30, 40), (2, 400)])
def test_on_off_counts_have_their_closed_forms(n_on: int, n_off: int) -> None:
    level = Gamma(shape=1.5, rate=0.1)
    analysis = counting(n_on, level, Exponential(1.0), control=n_off)
    prior = (level.shape, level.rate)
    signal = closed_forms.ln_on_off_signal(n_on, n_off, TAU, prior, (1.0, 1.0 / YIELD))
    assert agrees(of(analysis, SIGNAL), signal)
    assert agrees(of(analysis, "background only"), closed_forms.ln_on_off_background(n_on, n_off, TAU, prior))


@pytest.mark.parametrize(
    ("level", "exact"),
    [
        (Gamma(2.0, 0.5), float(count_mixtures.ln_gamma_mixture(9, 2.0, 0.5))),
        (Exponential(4.0), float(count_mixtures.ln_gamma_mixture(900, 1.0, 0.25))),
        (Uniform(0.0, 20.0), float(count_mixtures.ln_uniform_mixture(9, 0.0, 20.0))),
    ],
    ids=["gamma", "far out in an exponential", "uniform"],
)
def test_a_count_of_unknown_mean_has_its_mixture(level: Prior, exact: float) -> None:
    observed = 900 if exact < -100.0 else 9
    assert agrees(of(counting(observed, level, Exponential(1.0)), "background only"), exact)


@pytest.mark.parametrize("counts", [(14.0, 22.0), (20.0, 35.0), (8.0, 15.0)], ids=str)
def test_sources_that_only_raise_the_background_are_integrated(counts: tuple[float, float]) -> None:
    """Three of them: four modes or more, of which quadrature with one sampling pass made -6.55 for -6.18."""
    region = several_bins("r", list(counts), {"background": [10.0, 20.0], "signal": [3.0, 2.0]})
    sources = tuple(source(f"size {k}", background=(0.3, 0.3 - 0.05 * k)) for k in range(3))
    analysis = templates(region, Exponential(1.0), sources)
    rules = {f"size {k}": standard_normal(12) for k in range(3)}
    exact = ln_evidence(compile_model(analysis, "background only"), rules)
    assert agrees(of(analysis, "background only"), exact)
    few = {name: standard_normal(4) for name in rules}
    rules = few | {"strength": under(Exponential(1.0), *np.linspace(0.0, 6.0, 5), 20.0, nodes=8)}
    assert agrees(of(analysis, SIGNAL), ln_evidence(compile_model(analysis, SIGNAL), rules))


# The stated error.


def pulls(make: Callable[[], tuple[Terrain, float]], seeds: int) -> Array:
    terrain, exact = make()
    found = [anneal(terrain, np.random.SeedSequence((7, seed)), wanted_error=0.1) for seed in range(seeds)]
    assert sum(bool(one.doubt) for one in found) <= 2
    return np.array([(one.ln_evidence - exact) / one.error for one in found])


def is_calibrated(given: Array) -> bool:
    """Tell whether pulls average 0 and have a mean square of 1, within 4 standard errors each.

    Of Student's t with some 15 degrees of freedom, made narrower to hold 68 %: its square has a standard
    deviation of about 1.6.
    """
    root = np.sqrt(given.size)
    return bool(abs(given.mean()) < 4.0 / root and abs((given**2).mean() - 1.0) < 4.0 * 1.6 / root)


CASES = {
    "one narrow bell": lambda: bells(4, (1.0, 1.0, 0.1)),
    "a mode three times narrower": lambda: bells(
        3, (0.5, (-1.0, 0.5, 0.0), 0.5), (0.5, (1.5, -1.0, 1.0), 0.15)
    ),
    "same-side sources": lambda: bells(3, (0.5, (1.0, -1.0, 0.0), 0.2), (0.5, (-1.0, -1.0, 0.5), 0.2)),
}


@pytest.mark.slow
@pytest.mark.parametrize("name", list(CASES))
def test_the_error_between_populations_is_the_error(name: str) -> None:
    given = pulls(CASES[name], 40)
    print(f"{name}: mean {given.mean():.2f}, rms {np.sqrt((given**2).mean()):.2f}")
    assert is_calibrated(given)
    # Negative controls: an error a third of it, and an answer that is off by three of them.
    assert not is_calibrated(3.0 * given)
    assert not is_calibrated(given + 3.0)


@pytest.mark.slow
def test_a_careless_move_breaks_the_calibration(monkeypatch: pytest.MonkeyPatch) -> None:
    """The negative control of the engine itself: redrawing that forgets its own density."""
    fair = moves._PROPOSALS["redraw"]

    def careless(points: Array, dice: Dice, rung: Rung, terrain: Terrain) -> tuple[Array, Array]:
        return fair(points, dice, rung, terrain)[0], np.zeros(points.shape[:2])

    monkeypatch.setitem(moves._PROPOSALS, "redraw", careless)
    terrain, exact = CASES["one narrow bell"]()
    found = [anneal(terrain, np.random.SeedSequence((7, seed)), wanted_error=0.1) for seed in range(12)]
    assert abs(np.mean([(one.ln_evidence - exact) / one.error for one in found])) > 4.0 / np.sqrt(12)


# Chance, and how an answer is made.


def test_one_seed_gives_the_same_numbers_bit_for_bit() -> None:
    terrain, _ = bells(3, (1.0, 1.0, 0.2))
    first, again, other = (anneal(terrain, np.random.SeedSequence(seed)) for seed in (5, 5, 6))
    assert first.ln_evidence == again.ln_evidence
    assert np.array_equal(first.points, again.points)
    assert first.ln_evidence != other.ln_evidence


def test_a_population_does_not_depend_on_the_others() -> None:
    terrain, _ = bells(2, (1.0, 1.0, 0.2))
    rungs = scout(terrain, np.random.default_rng(1), 256, 10**6).rungs
    seeds = np.random.SeedSequence(4).spawn(3)
    together = ascend(terrain, rungs, [np.random.default_rng(one) for one in seeds], 16)
    alone = ascend(terrain, rungs, [np.random.default_rng(seeds[1])], 16)
    assert together.ln_evidence[1] == pytest.approx(alone.ln_evidence[0], abs=1e-9)
    assert together.ln_evidence[0] != alone.ln_evidence[0]


def test_draws_are_weighted_by_their_own_populations_evidence() -> None:
    terrain, _ = bells(2, (0.8, (1.0, 0.0), 0.3), (0.2, (-1.0, 0.0), 0.3))
    found = anneal(terrain, np.random.SeedSequence(8))
    assert found.points.shape == (*found.ln_weights.shape, 2)
    assert np.exp(found.ln_weights).mean() == pytest.approx(np.exp(found.runs).mean())
    share = np.exp(found.ln_weights - found.ln_weights.max())
    right = float(share @ (found.points[:, 0] > 0.0) / share.sum())
    assert abs(right - 0.8) < 0.03


def test_a_number_of_evaluations_is_kept_to() -> None:
    terrain, _ = bells(2, (1.0, 2.0, 1e-4))
    stopped = anneal(terrain, np.random.SeedSequence(1), most=400_000)
    assert "too long" in stopped.doubt
    assert "too many" in anneal(terrain, np.random.SeedSequence(1), most=10_000).doubt
    assert not np.isfinite(stopped.ln_evidence)
    short = anneal(terrain, np.random.SeedSequence(1), most=10**6, wanted_error=1e-9)
    assert 3 * 10**5 < short.evaluations <= 10**6


def test_counts_that_nothing_can_produce_have_no_evidence() -> None:
    terrain = replace(bells(1, (1.0, 0.0, 1.0))[0], ln_likelihood=lambda x: np.full(len(x), -np.inf))
    found = anneal(terrain, np.random.SeedSequence(1))
    assert found.doubt == "no draw can produce the observed counts"


def test_larger_hypotheses_are_given_fewer_evaluations() -> None:
    small, large = (
        compile_model(
            templates(several_bins("r", [3.0] * bins, {"background": [2.0] * bins})), "background only"
        )
        for bins in (300, 3000)
    )
    assert most_evaluations(large) * 9 < most_evaluations(small) <= 6_000_000


def test_the_next_power_keeps_the_effective_number_of_states() -> None:
    generator = np.random.default_rng(2)
    for scale in (1.0, 1e3, 1e9):
        ln_likelihood = -scale * generator.standard_normal(4000) ** 2
        change = next_change(ln_likelihood, 1.0)
        weights = np.exp((ln_likelihood - ln_likelihood.max()) * change)
        if change < 1.0:
            assert weights.sum() ** 2 / (weights**2).sum() / 4000 == pytest.approx(0.7, abs=0.01)
    assert next_change(np.zeros(10), 0.4) == 0.4


# Populations that don't support each other.


def scattered(sd: float) -> Array:
    return np.random.default_rng(3).normal(-20.0, sd, (2, POPULATIONS))


def test_populations_that_agree_are_not_doubted() -> None:
    assert disagreement(scattered(0.2)) == ""


def test_populations_that_scatter_widely_are_doubted() -> None:
    assert "of their mean" in disagreement(scattered(1.5))


def test_one_population_far_ahead_of_the_others_is_a_mode_that_these_missed() -> None:
    """It would raise the mean by 14 % only, with an error of a tenth: nothing else would tell."""
    each = scattered(0.05)
    each[-1, 4] += 1.2
    assert disagreement(each) == "1 of 16 annealed populations found what the others missed"


def test_two_rounds_that_differ_are_doubted() -> None:
    each = scattered(0.1)
    each[0] -= 0.4
    assert "two rounds" in disagreement(each)


def test_a_population_that_ended_nowhere_is_doubted() -> None:
    each = scattered(0.1)
    each[-1, 0] = -np.inf
    assert "impossible" in disagreement(each)


def test_few_values_have_a_wider_error() -> None:
    """Student's t: 84.13 % at 1.321 for 2 and at 1.034 for 15 degrees of freedom; scipy.stats.t."""
    assert widened(3) == pytest.approx(1.3213, abs=1e-3)
    assert widened(16) == pytest.approx(1.0343, abs=1e-3)
