"""ln B under every family of priors: one count on a known background, integrated by scipy."""

from __future__ import annotations

from collections.abc import Callable
from itertools import pairwise

import numpy as np
import pytest
from scipy import integrate, stats

from tests.evidence.prior_choice.curves import counted, curve_of
from tests.evidence.small_analyses import YIELD, counting, several_bins, templates
from workbench.evidence.formulas import closed_forms
from workbench.evidence.prior_choice.averages import average
from workbench.evidence.prior_choice.curve import LEAST_TOLD
from workbench.evidence.prior_choice.families import DECADES, Family, families
from workbench.evidence.prior_choice.reference import ReferenceLike, events_of, reference_family
from workbench.hypotheses.priors import Exponential, Fixed, Gamma, Uniform
from workbench.likelihood.model import compile_model

OBSERVED, BACKGROUND = 9.0, 3.8
Density = Callable[[float], float]

MEANS = (0.05, 0.4, 0.9, 2.0, 6.0)
BOTH = "signal plus background"
CURVE = curve_of(counted(OBSERVED, BACKGROUND, YIELD), 12.0)
FAMILIES = families(
    reference_family(compile_model(counting(OBSERVED, BACKGROUND, Exponential(1.0)), BOTH), "strength", 10.0)
)


def density(family: str, mean: float) -> tuple[Density, tuple[float, float]]:
    """Return a family's density as scipy or its formula has it, with its support."""
    root = np.sqrt
    if family == "uniform":
        return stats.uniform(0.0, 2.0 * mean).pdf, (0.0, 2.0 * mean)
    if family == "exponential":
        return stats.expon(scale=mean).pdf, (0.0, 60.0 * mean)
    if family == "half-normal":
        return stats.halfnorm(scale=mean * root(np.pi / 2.0)).pdf, (0.0, 40.0 * mean)
    if family == "gamma":
        return stats.gamma(2.0, scale=mean / 2.0).pdf, (0.0, 60.0 * mean)
    if family == "log-normal":
        sd = np.log(2.0)
        return stats.lognorm(sd, scale=mean * np.exp(-0.5 * sd**2)).pdf, (0.0, 200.0 * mean)
    if family == "log-uniform":
        high = mean * DECADES * np.log(10.0) / (1.0 - 10.0**-DECADES)
        return stats.loguniform(high * 10.0**-DECADES, high).pdf, (high * 10.0**-DECADES, high)
    return reference(mean)


def reference(mean: float) -> tuple[Density, tuple[float, float]]:
    """Return 1/sqrt(s + b/y) on [0, u]: its integrals are elementary, its end u is found by bisection."""
    c = BACKGROUND / YIELD

    def mean_of(u: float) -> float:
        norm = 2.0 * (np.sqrt(u + c) - np.sqrt(c))
        return float((2.0 / 3.0 * ((u + c) ** 1.5 - c**1.5) - c * norm) / norm)

    low, high = mean, 4.0 * mean
    for _ in range(100):
        middle = 0.5 * (low + high)
        low, high = (middle, high) if mean_of(middle) < mean else (low, middle)
    norm = 2.0 * (np.sqrt(high + c) - np.sqrt(c))
    return (lambda s: 1.0 / np.sqrt(s + c) / norm), (0.0, high)


def by_scipy(family: str, mean: float) -> float:
    pdf, (low, high) = density(family, mean)
    ends = [
        low,
        *(x for x in (0.02, 0.1, 0.3, 0.6, 0.9, 1.3, 2.0, 3.0, 5.0, 12.0, 40.0) if low < x < high),
        high,
    ]
    ratio = counted(OBSERVED, BACKGROUND, YIELD)
    parts = [
        integrate.quad(lambda s: float(pdf(s) * np.exp(ratio(s))), a, b, epsabs=1e-14, epsrel=1e-11)[0]
        for a, b in pairwise(ends)
    ]
    return float(np.log(sum(parts)))


@pytest.mark.parametrize("mean", MEANS)
@pytest.mark.parametrize("family", [one for one in FAMILIES if one.name != "point"], ids=lambda one: one.name)
def test_a_family_averages_to_what_scipy_integrates(family: Family, mean: float) -> None:
    found = average(CURVE, family.member(mean)).ln_bayes_factor
    assert found == pytest.approx(by_scipy(family.name, mean), abs=3e-4)
    # The negative control: a mean a tenth off is another number.
    assert (
        abs(by_scipy(family.name, 1.1 * mean) - by_scipy(family.name, mean)) > 6e-4
        or family.name == "log-uniform"
    )


@pytest.mark.parametrize("mean", MEANS)
@pytest.mark.parametrize("family", [one for one in FAMILIES if one.name != "point"], ids=lambda one: one.name)
def test_a_member_has_the_mean_that_was_asked_for(family: Family, mean: float) -> None:
    member = family.member(mean)
    found = member.mean if isinstance(member, ReferenceLike) else member.moments.mean
    assert found == pytest.approx(mean, rel=1e-5)


def test_a_point_is_r_itself() -> None:
    (point,) = (one for one in FAMILIES if one.name == "point")
    found = average(CURVE, point.member(0.9))
    by_hand = OBSERVED * np.log1p(0.9 * YIELD / BACKGROUND) - 0.9 * YIELD
    assert found.ln_bayes_factor == pytest.approx(by_hand, abs=1e-6)
    assert point.member(0.9) == Fixed(0.9)


def test_gamma_and_uniform_priors_land_on_their_closed_forms() -> None:
    """The count's evidence under a gamma prior of shape a and rate r of the events is a finite sum."""
    null = float(stats.poisson.logpmf(OBSERVED, BACKGROUND))
    gamma = closed_forms.ln_known_background(int(OBSERVED), BACKGROUND, 2.0, 2.5 / YIELD)
    assert average(CURVE, Gamma(2.0, 2.5)).ln_bayes_factor == pytest.approx(gamma - null, abs=1e-4)
    mean = closed_forms.ln_known_background_exponential(int(OBSERVED), BACKGROUND, 0.7 * YIELD)
    assert average(CURVE, Exponential(0.7)).ln_bayes_factor == pytest.approx(mean - null, abs=1e-4)


def test_what_no_verdict_rests_on_is_only_said_to_be_below() -> None:
    assert average(CURVE, Fixed(11.0)).ln_bayes_factor is None
    assert float(CURVE.at(np.array(11.0))) < LEAST_TOLD


def test_what_lies_beyond_the_curve_is_in_the_error() -> None:
    """A curve that stops where R is still large: the uniform prior reaches twice as far."""
    short = curve_of(counted(OBSERVED, BACKGROUND, YIELD), 1.2)
    whole = average(CURVE, Uniform(0.0, 2.4)).ln_bayes_factor
    cut = average(short, Uniform(0.0, 2.4))
    assert cut.ln_bayes_factor is not None
    assert cut.error is not None
    assert whole is not None
    assert 0.05 < whole - cut.ln_bayes_factor < cut.error


def test_errors_of_the_nodes_pass_through() -> None:
    noisy = curve_of(counted(OBSERVED, BACKGROUND, YIELD), 12.0, error=0.02)
    assert average(noisy, Exponential(1.0)).error == pytest.approx(0.02, rel=1e-3)


def test_the_reference_like_density_follows_the_root_of_the_information() -> None:
    """By hand, two bins: y1^2/(s y1 + b1) + y2^2/(s y2 + b2)."""
    region = several_bins("main", [3.0, 5.0], {"flat": [2.0, 4.0], "signal": [1.0, 3.0]})
    model = compile_model(templates(region), BOTH)
    assert events_of(model, "strength") == pytest.approx(4.0)
    family = reference_family(model, "strength", 5.0)
    prior = family.with_mean(2.0)

    def root(s: float) -> float:
        return float(np.sqrt(1.0 / (s + 2.0) + 9.0 / (3.0 * s + 4.0)))

    norm = integrate.quad(root, 0.0, prior.high)[0]
    for s in (0.3, 1.0, 3.0):
        below = integrate.quad(root, 0.0, s)[0] / norm
        assert float(prior.below(np.array(s))) == pytest.approx(below, rel=1e-4)
