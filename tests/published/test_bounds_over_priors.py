"""The most that a p-value, or a class of priors, allows a Bayes factor to be, as printed elsewhere."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import special

from tests.evidence.prior_choice.curves import Function, curve_of
from tests.published.printed import Printed, of_topic
from workbench.evidence.formulas import scales
from workbench.evidence.formulas.needed_prior import least_prior
from workbench.evidence.formulas.p_value_bound import ln_largest_from_p
from workbench.evidence.prior_choice.bounds import largest_never_rising, largest_of_any


def by_p_value(what: str, p: float) -> float:
    ln_odds = float(ln_largest_from_p(p))
    values = {
        "bound": np.exp(-ln_odds),
        "alpha": 1.0 / (1.0 + np.exp(ln_odds)),
        "odds_against_null": np.exp(ln_odds),
        "ln_odds_against_null": ln_odds,
    }
    return float(values[what])


def likelihood_ratio(t: float) -> Function:
    """A normal measurement t standard deviations from 0: ln of its ratio to the null at theta."""
    return lambda theta: t * theta - 0.5 * theta**2


def folded(t: float) -> Function:
    """The same averaged over theta and -theta, which is all that a symmetric prior sees of it."""
    return lambda theta: np.logaddexp(t * theta, -t * theta) - np.log(2.0) - 0.5 * theta**2


def over_priors(t: float, priors: str, what: str) -> float:
    """The least weight of the null: against any prior, any symmetric, any symmetric with its peak at 0."""
    reach = t + 9.0
    bound = {
        "all": lambda: largest_of_any(curve_of(likelihood_ratio(t), reach)),
        "symmetric": lambda: largest_of_any(curve_of(folded(t), reach)),
        "unimodal": lambda: largest_never_rising(curve_of(folded(t), reach)),
    }[priors]()
    odds = float(np.exp(-bound.ln_bayes_factor))
    return {"bound": odds, "posterior": odds / (1.0 + odds)}[what]


@of_topic("p-against-bayes-factor", "sbb", "max", "redefine")
def test_the_bound_from_a_p_value(printed: Printed) -> None:
    printed.check(by_p_value(**printed.inputs))


@of_topic("p-against-bayes-factor", "prior-class")
def test_the_bound_over_a_class_of_priors(printed: Printed) -> None:
    """J.O. Berger and T. Sellke (1987): what this finds numerically on a curve, they tabulated."""
    computed = over_priors(**printed.inputs)
    assert abs(computed - printed.value) <= printed.precision
    assert computed == pytest.approx(printed.recomputed, rel=2e-5)


@of_topic("p-against-bayes-factor", "gauss")
def test_the_bound_over_any_prior_of_a_normal_measurement(printed: Printed) -> None:
    z = printed.inputs["z"]
    ln_odds = largest_of_any(curve_of(likelihood_ratio(z), z + 9.0)).ln_bayes_factor
    computed = float(np.exp({"bound": -ln_odds, "inverse": ln_odds}[printed.inputs["what"]]))
    assert abs(computed - printed.value) <= printed.precision
    assert computed == pytest.approx(printed.recomputed, rel=2e-5)


@of_topic("p-against-bayes-factor", "null-percent")
def test_a_bayes_factor_makes_a_posterior_of_a_prior(printed: Printed) -> None:
    prior, bf01 = printed.inputs["prior"], printed.inputs["bf01"]
    printed.check(100.0 * float(scales.probability(bf01 * prior / (1.0 - prior))))


@of_topic("p-against-bayes-factor", "prior-for")
def test_the_prior_that_leads_to_a_posterior(printed: Printed) -> None:
    """The printed one is the null's: the most it may have been; the alternative's is the rest."""
    posterior, bf01 = printed.inputs["posterior"], printed.inputs["bf01"]
    printed.check(100.0 * (1.0 - float(least_prior(-np.log(bf01), 1.0 - posterior))))


def test_the_prior_needed_by_hand() -> None:
    """B = 10 needs 0.655 for 0.95, B = 150 needs 0.112: 1/(1 + 10/19) and 1/(1 + 150/19)."""
    assert float(least_prior(np.log(10.0), 0.95)) == pytest.approx(19.0 / 29.0, rel=1e-12)
    assert float(least_prior(np.log(150.0), 0.95)) == pytest.approx(19.0 / 169.0, rel=1e-12)
    assert float(least_prior(0.0, 0.99)) == pytest.approx(0.99, rel=1e-12)


def test_the_bound_from_a_p_value_ends_at_one_over_e() -> None:
    assert float(ln_largest_from_p(np.exp(-1.0))) == pytest.approx(0.0, abs=1e-12)
    assert float(ln_largest_from_p(0.7)) == pytest.approx(0.0, abs=1e-12)
    assert float(ln_largest_from_p(1e-300)) == pytest.approx(
        300.0 * np.log(10.0) - 1.0 - np.log(300.0 * np.log(10.0))
    )


def test_the_bound_from_a_p_value_nearly_meets_that_over_priors_with_their_peak_at_0() -> None:
    """Sellke, Bayarri and Berger compare the two for a two-sided p of a normal measurement."""
    for t in (1.96, 2.576, 3.291):
        p = 2.0 * float(special.ndtr(-t))
        unimodal = -np.log(over_priors(t, "unimodal", "bound"))
        assert unimodal == pytest.approx(float(ln_largest_from_p(p)), abs=0.1)
