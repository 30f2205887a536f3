"""Bayes factors that lectures and papers printed.

Sources stand beside each value in values.toml. Those known "from memory" confirm the number, not its origin.
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy import integrate, stats

from tests.published.printed import Printed, of_topic
from workbench.evidence.formulas import closed_forms, count_mixtures, on_off, reference_odds


def gamma_background(what: str, n: int, s: float, q: float, k: float) -> float:
    """The lecture's background: Q counts elsewhere with k times the exposure, flat prior before."""
    shape, rate = q + 1.0, k
    ln_p0 = float(count_mixtures.ln_gamma_mixture(n, shape, rate))
    ln_p1 = closed_forms.ln_known_background(n, s, shape, rate)
    tail = float(on_off.gamma_averaged_tail(n, shape, rate))
    values = {
        "p_h0": np.exp(ln_p0),
        "p_h1": np.exp(ln_p1),
        "B10": np.exp(ln_p1 - ln_p0),
        "sqrt_2lnB": np.sqrt(2.0 * (ln_p1 - ln_p0)),
        "tail": tail,
        "z": on_off.significance(tail),
    }
    return float(values[what])


def intrinsic(what: str, x: int, b: float) -> float:
    values = {
        "p": on_off.known_tail(x, b),
        "B01": np.exp(reference_odds.ln_intrinsic(x, b)),
        "max_lr_bound": np.exp(reference_odds.ln_largest_support(x, b)),
    }
    return float(values[what])


def jeffreys(what: str, n_on: int, n_off: int, alpha_num: float, alpha_den: float) -> float:
    odds = np.exp(reference_odds.ln_on_off_jeffreys(n_on, n_off, alpha_num / alpha_den))
    return float({"P0": odds / (1.0 + odds), "B01": odds}[what])


def jeffreys_by_quadrature(n_on: int, n_off: int, alpha: float) -> float:
    """Integrate both Jeffreys priors: 1/sqrt(m b) over means m > alpha b, and sqrt(1/b) on the line.

    With m = r^2 cos^2 and b = r^2 sin^2 the plane's integral is one over r times one over the angle. The
    constants make the odds 1 without counts.
    """

    def plane(on: int, off: int) -> float:
        radial, _ = integrate.quad(lambda r: r ** (2 * (on + off) + 1) * np.exp(-r * r), 0, 12, epsrel=1e-13)
        edge = np.arctan(1.0 / np.sqrt(alpha))
        angle, _ = integrate.quad(
            lambda phi: np.cos(phi) ** (2 * on) * np.sin(phi) ** (2 * off), 0, edge, epsrel=1e-13
        )
        return float(radial * angle)

    def line(on: int, off: int) -> float:
        # b = y^2 removes the pole at 0
        value, _ = integrate.quad(
            lambda y: alpha**on * y ** (2 * (on + off)) * np.exp(-(1.0 + alpha) * y * y), 0, 12, epsrel=1e-13
        )
        return float(value)

    return line(n_on, n_off) / plane(n_on, n_off) / (line(0, 0) / plane(0, 0))


@of_topic("published-bayes-factors", "prosper")
def test_a_count_on_a_gamma_background(printed: Printed) -> None:
    printed.check(gamma_background(**printed.inputs))


@of_topic("published-bayes-factors", "berger")
def test_a_count_on_a_known_background_with_the_intrinsic_prior(printed: Printed) -> None:
    printed.check(intrinsic(**printed.inputs))


@of_topic("published-bayes-factors", "knoetig-grb", "knoetig-norm")
def test_on_off_counts_under_jeffreys_priors(printed: Printed) -> None:
    printed.check(jeffreys(**printed.inputs))


@of_topic("published-bayes-factors", "knoetig-closed")
def test_the_jeffreys_closed_form_is_the_integral_over_both_priors(printed: Printed) -> None:
    n_on, n_off = printed.inputs["n_on"], printed.inputs["n_off"]
    alpha = printed.inputs["alpha_num"] / printed.inputs["alpha_den"]
    closed = np.exp(reference_odds.ln_on_off_jeffreys(n_on, n_off, alpha))
    printed.check(float(closed / jeffreys_by_quadrature(n_on, n_off, alpha) - 1.0))


def split(what: str, n1: int, n2: int, a: float) -> float:
    ln_fair = reference_odds.ln_fair_split(n1, n2)
    ln_unknown = reference_odds.ln_unknown_split(n1, n2, a)
    return float(
        {
            "B10": np.exp(ln_unknown - ln_fair),
            "B01": np.exp(ln_fair - ln_unknown),
            "m0": np.exp(ln_fair),
            "m1": np.exp(ln_unknown),
        }[what]
    )


@of_topic("published-bayes-factors", "euro-1", "euro-2", "euro-4", "euro-5", "euro-7")
def test_a_split_of_counts_against_a_fair_one(printed: Printed) -> None:
    printed.check(split(**printed.inputs))


@of_topic("published-bayes-factors", "euro-binomial")
def test_the_tail_of_a_fair_split(printed: Printed) -> None:
    k, n = printed.inputs["k"], printed.inputs["n"]
    tail = float(on_off.binomial_tail(k, n - k, 1.0))
    printed.check(tail)
    assert tail == pytest.approx(float(stats.binom.sf(k - 1, n, 0.5)), rel=1e-12)


@of_topic("lindley", "births-m", "jahn-b")
def test_large_samples_of_a_fair_split(printed: Printed) -> None:
    printed.check(split(**printed.inputs))


@pytest.mark.parametrize(("observed", "background"), [(0, 0.7), (1, 0.7), (2, 3.0), (9, 2.2), (40, 100.0)])
def test_the_intrinsic_bayes_factor_is_its_integral(observed: int, background: float) -> None:
    def integrand(s: float) -> float:
        return float(stats.poisson.pmf(observed, s + background)) * background / (s + background) ** 2

    near = max(observed - background, 1.0)
    evidence = sum(
        integrate.quad(integrand, low, high, epsabs=0.0, epsrel=1e-12)[0]
        for low, high in [(0.0, near), (near, 4.0 * near + 40.0), (4.0 * near + 40.0, np.inf)]
    )
    odds = stats.poisson.pmf(observed, background) / evidence
    assert reference_odds.ln_intrinsic(observed, background) == pytest.approx(np.log(odds), abs=1e-9)


def test_a_background_far_above_the_count_does_not_underflow() -> None:
    assert reference_odds.ln_intrinsic(3, 5000.0) == pytest.approx(np.log(5001.0), abs=1e-3)
