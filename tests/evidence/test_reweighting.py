"""The evidence under another prior of the strength, from nodes that stand."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from scipy import integrate as scipy_integrate

from tests.analyses import counting
from workbench.evidence.integral.quadrature import integrate
from workbench.evidence.reweighting import ln_change
from workbench.hypotheses.file.reading import read_analysis
from workbench.hypotheses.priors import Exponential, Gamma, HalfNormal, Prior, Uniform
from workbench.likelihood.model import compile_model

DATA = Path(__file__).parents[2] / "data"
BACKGROUND, OBSERVED, YIELD = 3.8, 9.0, 6.0
GAMMA = Gamma(2.0, 2.0)


def evidence(prior: Prior) -> float:
    """Return int Poisson(n | b + y s) prior(s) ds without the n!, by quadrature."""

    def integrand(s: float) -> float:
        expected = BACKGROUND + YIELD * s
        return float(np.exp(OBSERVED * np.log(expected) - expected + prior.ln_density(s)))

    value, _ = scipy_integrate.quad(integrand, 0.0, min(prior.support[1], 40.0), points=[0.9], limit=200)
    return float(value)


@pytest.mark.parametrize(
    "prior",
    [
        Uniform(0.0, 2.5),
        Uniform(0.0, 10.0),
        Exponential(0.5),
        Exponential(2.0),
        HalfNormal(1.0),
        Gamma(2.0, 2.0),
    ],
    ids=lambda prior: prior.text(),
)
def test_another_prior_gives_what_direct_integration_gives(prior: Prior) -> None:
    """Independent route: scipy's quad of the Poisson probability over either prior, known background."""
    declared = Uniform(0.0, 5.0)
    model = compile_model(counting(OBSERVED, BACKGROUND, YIELD, declared), "signal plus background")
    grid = integrate(model, np.array([OBSERVED]))
    assert grid is not None

    change = ln_change(grid, prior)
    assert change is not None
    assert change == pytest.approx(np.log(evidence(prior) / evidence(declared)), abs=2e-3)
    # The negative control: a prior a tenth wider than declared is told apart.
    wider = prior.scaled(1.1)
    assert wider is not None
    assert abs(change - np.log(evidence(wider) / evidence(declared))) > 0.02


def test_the_declared_prior_changes_nothing_and_twice_the_range_halves_exactly() -> None:
    """By hand: a uniform prior twice as wide has half the density wherever the likelihood lives."""
    analysis = read_analysis(DATA / "skerry" / "skerry.toml")
    model = compile_model(analysis, "resonance")
    assert model.observed is not None
    grid = integrate(model, model.observed)
    assert grid is not None
    assert ln_change(grid, Uniform(0.0, 5.0)) == pytest.approx(0.0, abs=1e-12)
    assert ln_change(grid, Uniform(0.0, 10.0)) == pytest.approx(-np.log(2.0), abs=1e-9)


def test_a_prior_that_reaches_beyond_the_nodes_is_not_answered() -> None:
    """A strength cut off by its prior where the likelihood grows says nothing about larger ones."""
    model = compile_model(counting(40.0, BACKGROUND, YIELD, Uniform(0.0, 1.0)), "signal plus background")
    grid = integrate(model, np.array([40.0]))
    assert grid is not None
    assert ln_change(grid, Uniform(0.0, 10.0)) is None
    assert ln_change(grid, Uniform(0.0, 0.9)) is not None
