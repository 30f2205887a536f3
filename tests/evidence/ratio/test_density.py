"""Posterior densities read from an updating ratio, against sums and draws that know nothing of it."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import numpy.typing as npt
import pytest
from scipy import integrate, special, stats

from tests.evidence.ratio.bumps import STRENGTH_PRIORS, TO_FIVE, observed_bump, uncertain_bump
from tests.evidence.small_analyses import YIELD, bump, counting
from workbench.ensembles.strengths import weighted_quantiles
from workbench.errors import InputError
from workbench.evidence.central import CENTRAL
from workbench.evidence.integral.sampling import SCRAMBLES
from workbench.evidence.ratio.at_once import AtOnce
from workbench.evidence.ratio.density import Density
from workbench.evidence.ratio.results import Scan
from workbench.evidence.updating_ratio import scan
from workbench.evidence.weigh import weigh_hypothesis
from workbench.hypotheses.analysis import Parameter
from workbench.hypotheses.priors import (
    Exponential,
    Fixed,
    Gamma,
    HalfNormal,
    Normal,
    Prior,
    Uniform,
)
from workbench.likelihood.model import compile_model

Array = npt.NDArray[np.float64]


@pytest.fixture(scope="module")
def counted() -> AtOnce:
    return AtOnce(scan(counting(9.0, 3.0, TO_FIVE)))


@pytest.fixture(scope="module")
def bumps() -> Scan:
    return scan(uncertain_bump(), seed=3)


def numbers(density: Density) -> Array:
    return np.array([density.median, density.low, density.high])


def errors(density: Density) -> Array:
    return np.array([density.median_error, density.low_error, density.high_error])


@pytest.mark.parametrize("prior", STRENGTH_PRIORS)
def test_the_density_of_one_count_is_its_likelihood_times_the_prior(counted: AtOnce, prior: Prior) -> None:
    """The cumulative posterior in 400,000 steps of equal prior probability, the likelihood from scipy."""
    found = counted.under({"strength": prior}).densities["strength"]
    strength = prior.quantile((np.arange(400_000) + 0.5) / 400_000)
    weights = stats.poisson(3.0 + YIELD * strength).pmf(9)
    exact = weighted_quantiles(strength, weights / weights.sum(), CENTRAL)
    width = found.high - found.low
    np.testing.assert_allclose(numbers(found), exact, atol=2e-3 * width)
    assert found.mass.sum() == pytest.approx(1.0)
    for place in exact:
        below = weights[strength < place].sum() / weights.sum()
        assert found.below(float(place)) == pytest.approx(below, abs=2e-3)
    prior_alone = prior.quantile(CENTRAL)
    if width < 0.5 * (prior_alone[2] - prior_alone[1]):  # the negative control: the counts matter
        assert np.abs(numbers(found) - prior_alone).max() > 0.1 * width


def test_the_height_of_a_density_is_right_where_it_is_drawn(counted: AtOnce) -> None:
    found = counted.under({"strength": Exponential(1.0)}).densities["strength"]

    def height(s: float | Array) -> Array:
        return np.asarray(stats.poisson(3.0 + YIELD * np.asarray(s)).pmf(9) * np.exp(-np.asarray(s)))

    whole = integrate.quad(height, 0.0, 30.0, limit=300)[0]
    seen = found.mass > 1e-6
    np.testing.assert_allclose(found.density[seen], height(found.values[seen]) / whole, rtol=5e-3)


PRIORS: list[tuple[Prior, Prior]] = [
    (TO_FIVE, Uniform(1.0, 19.0)),
    (Exponential(1.0), Uniform(4.0, 12.0)),
    (HalfNormal(1.5), Normal(7.0, 0.6)),
    (Gamma(2.0, 2.0), Normal(10.0, 2.0, 3.0, 18.0)),
]


@pytest.mark.parametrize(("strength", "mass"), PRIORS)
def test_densities_agree_with_the_engines_weighted_draws(bumps: Scan, strength: Prior, mass: Prior) -> None:
    """Draws made anew under each prior; their errors from the spread of independent scrambles."""
    base = uncertain_bump()
    other = replace(base, parameters=(Parameter("strength", strength), Parameter("mass", mass)))
    model = compile_model(other, "signal plus background")
    sample = weigh_hypothesis(model, np.random.SeedSequence(12)).sample
    assert sample is not None
    answer = AtOnce(bumps).under({"strength": strength, "mass": mass}, densities=["strength", "mass"])
    for name, prior in (("strength", strength), ("mass", mass)):
        values = prior.from_standard(sample.points[:, model.names.index(name)])[0]
        weights = special.softmax(sample.ln_weights)
        parts = [
            weighted_quantiles(x, w, CENTRAL)
            for x, w in zip(values.reshape(SCRAMBLES, -1), weights.reshape(SCRAMBLES, -1), strict=True)
        ]
        spread = np.std(parts, axis=0, ddof=1) / np.sqrt(SCRAMBLES)
        found = answer.densities[name]
        error = np.hypot(errors(found), spread)
        assert (np.abs(numbers(found) - weighted_quantiles(values, weights, CENTRAL)) < 4.5 * error).all()
        assert (error < 0.1 * (found.high - found.low)).all()
        if prior not in PRIORS[0]:  # the negative control: under the stated prior it is another density
            stated = AtOnce(bumps).under(densities=[name]).densities[name]
            assert (np.abs(numbers(stated) - numbers(found)) > 4.5 * error).any()


@pytest.mark.parametrize(("strength", "mass"), PRIORS)
def test_the_strength_of_a_bump_agrees_with_brute_force(strength: Prior, mass: Prior) -> None:
    """No uncertainties: the likelihood of every strength and mass by scipy, summed over a plain grid."""
    counts, edges = observed_bump(), np.linspace(0.0, 20.0, 41)
    continuum = 400.0 * np.diff(np.expm1(-edges / 8.0)) / np.expm1(-20.0 / 8.0)
    masses = mass.quantile((np.arange(2000) + 0.5) / 2000)
    strengths = strength.quantile((np.arange(1500) + 0.5) / 1500)
    shapes = 12.0 * np.diff(stats.norm.cdf((edges - masses[:, None]) / 0.4), axis=1)
    rows = []
    for shape in shapes:
        expected = continuum + strengths[:, None] * shape
        rows.append((counts * np.log(expected / continuum) - strengths[:, None] * shape).sum(axis=1))
    best = np.max(rows)
    total = np.exp(np.array(rows) - best).sum(axis=0)
    exact = weighted_quantiles(strengths, total / total.sum(), CENTRAL)
    found = AtOnce(scan(bump(counts, strength=TO_FIVE), seed=4)).under({"strength": strength, "mass": mass})
    density = found.densities["strength"]
    width = density.high - density.low
    assert (np.abs(numbers(density) - exact) < 3.0 * errors(density) + 4e-3 * width).all()
    ln_b = best + np.log(total.sum() / total.size / masses.size)
    assert found.average.ln_bayes_factor == pytest.approx(ln_b, abs=0.01)


def test_answers_do_not_depend_on_what_was_asked_before(bumps: Scan) -> None:
    asked = AtOnce(bumps)
    for strength, mass in [*PRIORS, *PRIORS[::-1]]:
        priors = {"strength": strength, "mass": mass}
        again = asked.under(priors, densities=["mass", "strength"])
        fresh = AtOnce(bumps).under(priors, densities=["strength", "mass"])
        for name in priors:
            np.testing.assert_array_equal(again.densities[name].mass, fresh.densities[name].mass)
        stated = bumps.reprior(priors)
        assert again.average.ln_bayes_factor == stated.ln_bayes_factor
    odds = asked.under(prior_odds=0.01).average.ln_posterior_odds
    assert odds == pytest.approx(bumps.reprior().ln_bayes_factor + np.log(0.01))


def test_a_parameter_held_by_its_prior_has_no_density(counted: AtOnce) -> None:
    found = counted.under({"strength": Fixed(1.5)}).densities["strength"]
    assert found.is_point
    assert found.density.size == 0
    assert (found.median, found.low, found.high) == (1.5, 1.5, 1.5)
    assert (found.below(1.4), found.below(1.6)) == (0.0, 1.0)


def test_a_scan_that_is_not_established_gives_no_density(bumps: Scan) -> None:
    doubtful = AtOnce(replace(bumps, established=False, reason="made up")).under()
    assert doubtful.densities == {}
    assert doubtful.average.ln_posterior_odds is None


def test_what_is_not_known_is_refused(bumps: Scan) -> None:
    with pytest.raises(InputError, match="stength"):
        AtOnce(bumps).under(densities=["stength"])
    with pytest.raises(InputError, match="reaches outside"):
        AtOnce(bumps).under({"strength": Uniform(0.0, 500.0)})
