"""Identities that closed forms must keep: with quadrature, with reference libraries, and with each other."""

from __future__ import annotations

import itertools
from collections.abc import Callable

import numpy as np
import pytest
from scipy import integrate, stats

from tests.published.printed import Printed, of_topic
from workbench.evidence.formulas import closed_forms, count_mixtures, on_off, reference_odds


def signal_evidence(n: int, b: float, prior_mean: float) -> float:
    """Integrate p(n | s + b) over an exponential prior with scipy, its peak given."""
    value, _ = integrate.quad(
        lambda s: np.exp(stats.poisson.logpmf(n, s + b) - s / prior_mean) / prior_mean,
        0.0,
        n + 12.0 * np.sqrt(n) + 40.0,
        points=[max(n - b, 0.1)],
        epsabs=0.0,
        epsrel=1e-13,
        limit=200,
    )
    return float(value)


@of_topic("closed-forms", "exponential")
def test_the_exponential_prior_integrates_to_an_incomplete_gamma_function(printed: Printed) -> None:
    n, b, mean = (printed.inputs[name] for name in ("n", "b", "prior_mean"))
    closed = np.exp(closed_forms.ln_known_background_exponential(n, b, mean))
    printed.check(float(closed / signal_evidence(n, b, mean) - 1.0))


@of_topic("closed-forms", "savage")
def test_the_posterior_at_no_signal_over_the_prior_is_the_bayes_factor(printed: Printed) -> None:
    n, b, mean = (printed.inputs[name] for name in ("n", "b", "prior_mean"))
    posterior_at_zero = stats.poisson.pmf(n, b) / mean / signal_evidence(n, b, mean)
    ln_odds = stats.poisson.logpmf(n, b) - closed_forms.ln_known_background(n, b, 1.0, 1.0 / mean)
    printed.check(float(posterior_at_zero * mean / np.exp(ln_odds) - 1.0))


@of_topic("closed-forms", "gamma-poisson")
def test_the_negative_binomial_sum_is_the_integral_over_the_background(printed: Printed) -> None:
    n, s, q, k = (printed.inputs[name] for name in ("n", "s", "q", "k"))
    direct, _ = integrate.quad(
        lambda b: np.exp(stats.poisson.logpmf(n, s + b) + stats.gamma.logpdf(b, q + 1.0, scale=1.0 / k)),
        0.0,
        12.0,
        points=[q / k],
        epsabs=0.0,
        epsrel=1e-13,
        limit=200,
    )
    closed = np.exp(closed_forms.ln_known_background(n, s, q + 1.0, k))
    printed.check(float(closed / direct - 1.0))


@of_topic("closed-forms", "binomial")
def test_the_conditional_binomial_tail_is_the_gamma_averaged_poisson_tail(printed: Printed) -> None:
    n_on, n_off, tau = (printed.inputs[name] for name in ("n_on", "n_off", "tau"))
    tail = float(on_off.binomial_tail(n_on, n_off, tau))
    averaged, _ = integrate.quad(
        lambda b: stats.poisson.sf(n_on - 1, b) * stats.gamma.pdf(b, n_off + 1.0, scale=1.0 / tau),
        0.0,
        20.0,
        points=[n_off / tau],
        epsabs=0.0,
        epsrel=1e-13,
        limit=200,
    )
    printed.check(tail - float(averaged))
    printed.check(tail - float(stats.binom.sf(n_on - 1, n_on + n_off, 1.0 / (1.0 + tau))))


@of_topic("closed-forms", "equal-bins")
def test_the_odds_of_an_unknown_shape_average_to_one_under_a_flat_one(printed: Printed) -> None:
    total, bins = printed.inputs["total"], printed.inputs["bins"]
    fills = [np.bincount(fill, minlength=bins) for fill in itertools.product(range(bins), repeat=total)]
    printed.check(float(np.mean(np.exp(reference_odds.ln_unknown_shape(fills)))))


# Independent routes: scipy's nbinom, and quad told where the peak is.


@pytest.mark.parametrize(("shape", "rate"), [(1.0, 0.1), (0.5, 3.0), (42.0, 10.6), (2e4, 1e2)])
def test_the_gamma_mixture_is_the_negative_binomial_of_the_reference_library(
    shape: float, rate: float
) -> None:
    counts = np.array([0, 1, 2, 7, 40, 300])
    expected = stats.nbinom.logpmf(counts, shape, rate / (1.0 + rate))
    np.testing.assert_allclose(
        count_mixtures.ln_gamma_mixture(counts, shape, rate), expected, rtol=1e-9, atol=1e-9
    )


@pytest.mark.parametrize(
    ("low", "high"), [(0.0, 5.0), (3.0, 50.0), (90.0, 110.0), (0.0, 1e4), (2000.0, 3000.0)]
)
@pytest.mark.parametrize("n", [0, 3, 100, 2500])
def test_the_uniform_mixture_is_its_integral(n: int, low: float, high: float) -> None:
    peak = min(max(float(n), low), high)
    top = float(stats.poisson.logpmf(n, peak))
    width = 14.0 * np.sqrt(n + 4.0)
    at = [max(low, peak - width), peak, min(high, peak + width)]
    value = sum(
        integrate.quad(lambda m: np.exp(stats.poisson.logpmf(n, m) - top), a, b, epsabs=0.0, epsrel=1e-12)[0]
        for a, b in itertools.pairwise(at)
        if b > a
    )
    direct = np.log(value) + top - np.log(high - low)
    assert float(count_mixtures.ln_uniform_mixture(n, low, high)) == pytest.approx(direct, abs=1e-8)


@pytest.mark.parametrize(("n", "b"), [(0, 0.0), (0, 4.0), (1, 0.3), (17, 3.8), (60, 80.0), (1000, 900.0)])
@pytest.mark.parametrize("mean", [0.5, 10.0, 300.0])
def test_sum_and_incomplete_gamma_form_agree(n: int, b: float, mean: float) -> None:
    direct = closed_forms.ln_known_background(n, b, 1.0, 1.0 / mean)
    assert closed_forms.ln_known_background_exponential(n, b, mean) == pytest.approx(direct, abs=1e-10)


@pytest.mark.parametrize("n", [0, 4, 25])
def test_a_signal_with_a_gamma_prior_is_its_integral(n: int) -> None:
    def integrand(s: float) -> float:
        return float(stats.poisson.pmf(n, s + 3.0) * stats.gamma.pdf(s, 2.5, scale=4.0))

    direct, _ = integrate.quad(
        integrand, 0.0, 120.0, points=[max(n - 3.0, 1.0)], epsabs=0.0, epsrel=1e-12, limit=200
    )
    assert closed_forms.ln_known_background(n, 3.0, 2.5, 0.25) == pytest.approx(np.log(direct), abs=1e-9)


@pytest.mark.parametrize(("n_on", "n_off"), [(0, 0), (0, 12), (6, 14), (9, 0), (30, 40)])
def test_on_off_evidences_are_their_integrals(n_on: int, n_off: int) -> None:
    tau, prior, signal = 4.0, (1.5, 0.1), (1.0, 1.0 / 6.0)

    def of_background(b: float) -> float:
        return float(stats.poisson.pmf(n_off, tau * b) * stats.gamma.pdf(b, prior[0], scale=1.0 / prior[1]))

    peak = (n_on + n_off + 0.5) / (1.0 + tau)
    none, _ = integrate.quad(
        lambda b: stats.poisson.pmf(n_on, b) * of_background(b),
        0,
        60,
        points=[peak],
        epsabs=0.0,
        epsrel=1e-11,
        limit=300,
    )
    some, _ = integrate.quad(
        lambda b: np.exp(closed_forms.ln_known_background_exponential(n_on, b, 6.0)) * of_background(b),
        0,
        60,
        points=[peak],
        epsabs=0.0,
        epsrel=1e-11,
        limit=300,
    )
    assert closed_forms.ln_on_off_background(n_on, n_off, tau, prior) == pytest.approx(np.log(none), abs=1e-8)
    assert closed_forms.ln_on_off_signal(n_on, n_off, tau, prior, signal) == pytest.approx(
        np.log(some), abs=1e-8
    )


def test_the_on_off_evidence_is_the_formula_as_written() -> None:
    """n_off ln tau - ln n_on! - ln n_off! + a ln r - ln Gamma(a) + ln Gamma(N) - N ln(1 + tau + r)."""
    n_on, n_off, tau, shape, rate = 7, 11, 2.5, 3.0, 0.4
    from_gammas = (
        n_off * np.log(tau)
        - np.log(float(np.prod(np.arange(1.0, n_on + 1.0))))
        - np.log(float(np.prod(np.arange(1.0, n_off + 1.0))))
        + shape * np.log(rate)
        - np.log(2.0)
        + np.log(float(np.prod(np.arange(1.0, n_on + n_off + shape))))
        - (n_on + n_off + shape) * np.log(1.0 + tau + rate)
    )
    assert closed_forms.ln_on_off_background(n_on, n_off, tau, (shape, rate)) == pytest.approx(
        from_gammas, rel=1e-12
    )


@pytest.mark.parametrize("background", [0.0, 1.0, 50.0])
def test_no_counts_speak_against_a_signal_as_its_prior_allows_and_no_more(background: float) -> None:
    """By hand: B01 = 1 + S for an exponential prior of mean S, whatever the background."""
    for mean, odds in [(3.0, 4.0), (10.0, 11.0), (30.0, 31.0)]:
        ln_odds = -background - closed_forms.ln_known_background_exponential(0, background, mean)
        assert np.exp(ln_odds) == pytest.approx(odds, rel=1e-12)


def test_no_on_counts_give_the_same_odds_whatever_the_control_region_says() -> None:
    for n_off in (0, 5, 500):
        prior, signal = (1.0, 0.1), (2.0, 0.5)
        ln_odds = closed_forms.ln_on_off_signal(0, n_off, 3.0, prior, signal)
        ln_odds -= closed_forms.ln_on_off_background(0, n_off, 3.0, prior)
        assert ln_odds == pytest.approx(2.0 * np.log(0.5 / 1.5), rel=1e-12)


def test_the_evidences_of_all_outcomes_add_up_to_one() -> None:
    counts = range(600)
    evidences: tuple[Callable[[int], float], ...] = (
        lambda n: closed_forms.ln_known_background(n, 5.0, 2.0, 0.2),
        lambda n: closed_forms.ln_known_background_uniform(n, 5.0, 2.0, 40.0),
        lambda n: closed_forms.ln_gamma_background(n, (3.0, 0.5), (1.0, 0.1)),
    )
    for ln_evidence in evidences:
        assert sum(np.exp(ln_evidence(n)) for n in counts) == pytest.approx(1.0, abs=1e-10)


def test_the_inverse_odds_average_to_one_when_the_signal_is_there() -> None:
    """The identity of Turing and Good (I.J. Good 1985; from memory), summed, not simulated: E1[B01] = 1."""
    inverse = sum(
        np.exp(closed_forms.ln_known_background(n, 5.0, 1.0, 0.2))
        * np.exp(stats.poisson.logpmf(n, 5.0) - closed_forms.ln_known_background(n, 5.0, 1.0, 0.2))
        for n in range(400)
    )
    assert inverse == pytest.approx(1.0, abs=1e-12)


def test_half_a_line_under_a_parabola_is_a_gaussian_integral() -> None:
    for gradient, curvature in itertools.product([-40.0, -3.0, 0.0, 2.0, 25.0], [0.3, 1.0, 50.0]):
        peak = max(gradient / curvature, 0.0)
        top = gradient * peak - 0.5 * curvature * peak**2
        reach = peak + 12.0 / np.sqrt(curvature)
        value, _ = integrate.quad(
            lambda x, g=gradient, h=curvature, t=top: np.exp(g * x - 0.5 * h * x * x - t),
            0.0,
            reach,
            points=[peak, min(1.0 / (1.0 + abs(gradient)), 0.5 * reach)],
            epsrel=1e-12,
            limit=200,
        )
        closed = float(closed_forms.ln_half_line(gradient, curvature))
        assert closed == pytest.approx(np.log(value) + top, abs=1e-9)


def test_the_half_line_form_repairs_laplace_at_a_boundary() -> None:
    """Worked numerically elsewhere, flat prior on s >= 0, for counts of 5 on 10, 80 on 100, 900 on 1000.

    The ordinary form at the boundary is off by +1.84, +1.86, +2.20, the half-line form by -0.024, -0.007,
    -0.001.
    """
    for n, b, error, ordinary in [
        (5, 10.0, -0.024, 1.84),
        (80, 100.0, -0.007, 1.86),
        (900, 1000.0, -0.001, 2.20),
    ]:
        top = float(stats.poisson.logpmf(n, b))
        value, _ = integrate.quad(
            lambda s, n=n, b=b, t=top: np.exp(stats.poisson.logpmf(n, s + b) - t),
            0.0,
            60.0,
            points=[1.0],
            limit=200,
        )
        gradient, curvature = n / b - 1.0, n / b**2
        half_line = float(closed_forms.ln_half_line(gradient, curvature))
        assert half_line - np.log(value) == pytest.approx(error, abs=0.001)
        clipped = 0.5 * np.log(2.0 * np.pi / curvature)
        assert clipped - np.log(value) == pytest.approx(ordinary, abs=0.01)
