"""Poisson and negative binomial probabilities against other routes, up to 1e15 counts and down to nothing."""

from __future__ import annotations

import math
import warnings
from collections.abc import Callable
from decimal import Decimal, localcontext

import numpy as np
import numpy.typing as npt
import pytest
from scipy import special, stats

from workbench.likelihood.laws import (
    bin_ln_probability,
    half_deviance,
    ln_negative_binomial,
    ln_poisson,
    ln_saturated,
    log_gap,
    stirling_error,
)
from workbench.likelihood.slopes import negative_binomial_slopes, poisson_slopes

Array = npt.NDArray[np.float64]
PI = Decimal("3.14159265358979323846264338327950288419716939937510582097494459230781640628620899")
# B_2k/(2k (2k - 1)) for k = 1 to 10: Abramowitz and Stegun 6.1.40 and table 23.2, from memory.
STIRLING = [(1, 12), (-1, 360), (1, 1260), (-1, 1680), (1, 1188), (-691, 360360), (1, 156), (-3617, 122400)]


def ln_gamma(x: Decimal) -> Decimal:
    """ln of the gamma function in 50 digits: carried up to 60 or more, then by Stirling's series."""
    shift = Decimal(0)
    while x < 60:
        shift += x.ln()
        x += 1
    series = sum(Decimal(a) / b / x ** (2 * k + 1) for k, (a, b) in enumerate(STIRLING))
    return (x - Decimal("0.5")) * x.ln() - x + (2 * PI).ln() / 2 + series - shift


def many_digits(n: float, expected: float) -> float:
    """The ln Poisson probability from 50 decimal digits."""
    with localcontext() as context:
        context.prec = 50
        count, mean = Decimal(n), Decimal(expected)
        return float(count * mean.ln() - mean - ln_gamma(count + 1))


def many_digits_noisy(n: float, expected: float, variance: float) -> float:
    """The ln negative binomial probability from 50 decimal digits."""
    with localcontext() as context:
        context.prec = 50
        count, mean = Decimal(n), Decimal(expected)
        shape = mean * mean / Decimal(variance)
        whole = shape + mean
        return float(
            ln_gamma(count + shape)
            - ln_gamma(count + 1)
            - ln_gamma(shape)
            + shape * (shape / whole).ln()
            + count * (mean / whole).ln()
        )


def one(function: Callable[..., Array], *numbers: float) -> float:
    return float(function(*(np.array([number]) for number in numbers))[0])


def test_many_digits_know_the_factorials() -> None:
    with localcontext() as context:
        context.prec = 50
        assert float(ln_gamma(Decimal(21))) == pytest.approx(math.log(math.factorial(20)), rel=1e-15)
        assert float(ln_gamma(Decimal("0.5"))) == pytest.approx(0.5 * math.log(math.pi), rel=1e-15)


@pytest.mark.parametrize(
    ("n", "expected"),
    [
        (0, 1e-9),
        (0, 12.5),
        (1, 1e-300),
        (3, 1e-9),
        (7, 3.3),
        (15, 16.0),
        (17, 1.0),
        (1e5, 1.2e5),
        (1e9, 1e9),
        (1e9, 1e9 + 3e4),
        (1e9, 1.3e9),
        (1e12, 1e12 - 5e6),
        (1e15, 1e15 + 3e7),
    ],
)
def test_the_poisson_probability_keeps_its_digits(n: float, expected: float) -> None:
    """N8: from n ln v - v - ln n! the error is 5e-7 at 1e9 and 2 at 1e15."""
    assert one(ln_poisson, n, expected) == pytest.approx(many_digits(n, expected), rel=1e-13, abs=1e-13)


def test_the_plain_form_loses_its_digits_at_huge_counts() -> None:
    """The negative control of the test above: what the saddle-point form is for."""
    n, expected = 1e12, 1e12 - 5e6
    plain = n * math.log(expected) - expected - special.gammaln(n + 1.0)
    assert abs(plain - many_digits(n, expected)) > 1e-6


def test_ratios_of_huge_counts_are_taken_as_ratios() -> None:
    """N8: two log probabilities of 1e9 counts, each -2e8, leave 1e-8 in their difference."""
    n, b, s = 1e9, 5e8, 1.0
    with localcontext() as context:
        context.prec = 50
        truth = float(Decimal(n) * (1 + Decimal(s) / Decimal(b)).ln() - Decimal(s))
    assert n * math.log1p(s / b) - s == pytest.approx(truth, rel=1e-15)
    difference = one(ln_poisson, n, b + s) - one(ln_poisson, n, b)
    assert 1e-10 < abs(difference - truth) < 1e-6


def test_three_events_where_a_billionth_is_expected() -> None:
    """N9: by hand, 3 ln 1e-9 - 1e-9 - ln 6 = -62.1698 - 1.7918 = -63.9616."""
    counts, expected = np.array([3.0]), np.array([1e-9])
    assert one(ln_poisson, 3.0, 1e-9) == pytest.approx(3 * math.log(1e-9) - 1e-9 - math.log(6), rel=1e-15)
    assert round(float(bin_ln_probability(expected, None, counts)[0]), 4) == -63.9616


def test_the_poisson_probability_agrees_with_scipy() -> None:
    """scipy.stats.poisson as an independent route."""
    generator = np.random.default_rng(21)
    expected = 10.0 ** generator.uniform(-4, 4, 500)
    n = generator.poisson(expected).astype(float)
    truth = stats.poisson.logpmf(n, expected)
    np.testing.assert_allclose(ln_poisson(n, expected), truth, rtol=1e-10, atol=1e-10)
    np.testing.assert_allclose(bin_ln_probability(expected, None, n), truth, rtol=1e-10, atol=1e-10)


def test_both_forms_of_a_bin_agree_where_they_meet() -> None:
    n = np.array([0.0, 3.0, 5e4, 99999.0])
    expected = np.array([0.5, 2.0, 5.1e4, 1e5])
    with_a_large_one = bin_ln_probability(np.append(expected, 1e5), None, np.append(n, 1e5))[:-1]
    np.testing.assert_allclose(bin_ln_probability(expected, None, n), with_a_large_one, atol=1e-9)


def test_nothing_expected_allows_nothing_but_zero() -> None:
    expected, n = np.zeros(2), np.array([0.0, 2.0])
    for counts in (n, n * 1e6):
        found = bin_ln_probability(expected, None, counts)
        assert found[0] == 0.0
        assert found[1] == -np.inf
    assert bin_ln_probability(expected, np.ones(2), n).tolist() == [0.0, -np.inf]


def test_the_saturated_model_is_poisson_with_the_count_expected() -> None:
    n = np.array([[0.0, 1.0, 5.0], [300.0, 1e6, 2.0]])
    truth = stats.poisson.logpmf(n, np.maximum(n, 1e-300)).sum(axis=1)
    np.testing.assert_allclose(ln_saturated(n), truth, rtol=1e-9)


@pytest.mark.parametrize(
    "x", [-0.999999, -0.5, -0.2000001, -0.1999999, -1e-9, 0.0, 1e-9, 1e-4, 0.19, 0.21, 40.0]
)
def test_the_gap_of_the_logarithm_keeps_its_digits(x: float) -> None:
    with localcontext() as context:
        context.prec = 50
        truth = float(Decimal(x) - (1 + Decimal(x)).ln())
    assert one(log_gap, x, 1.0 + x) == pytest.approx(truth, rel=1e-13)


def test_half_the_deviance_is_zero_at_the_count_and_infinite_at_nothing() -> None:
    n, expected = np.array([0.0, 0.0, 4.0, 4.0, 2.0]), np.array([0.0, 3.0, 4.0, 8.0, 0.0])
    # By hand: 4 ln(4/8) + 8 - 4.
    assert half_deviance(n, expected).tolist() == pytest.approx(
        [0.0, 3.0, 0.0, 4 * math.log(0.5) + 4, math.inf]
    )


@pytest.mark.parametrize("n", [1e-8, 0.3, 1.0, 15.9, 16.0, 1e4])
def test_the_correction_to_stirlings_formula(n: float) -> None:
    with localcontext() as context:
        context.prec = 50
        x = Decimal(n)
        truth = float(ln_gamma(x + 1) - (x + Decimal("0.5")) * x.ln() + x - (2 * PI).ln() / 2)
    assert one(stirling_error, n) == pytest.approx(truth, rel=1e-11)


def test_the_negative_binomial_agrees_with_scipy() -> None:
    """scipy.stats.nbinom with r = A, p = A/(A + T) as an independent route."""
    generator = np.random.default_rng(22)
    expected = 10.0 ** generator.uniform(-2, 3, 400)
    variance = expected**2 * 10.0 ** generator.uniform(-4, 1, 400)
    shape = expected**2 / variance
    n = generator.poisson(expected * generator.gamma(shape) / shape).astype(float)
    truth = stats.nbinom.logpmf(n, shape, shape / (shape + expected))
    np.testing.assert_allclose(ln_negative_binomial(n, expected, variance), truth, rtol=1e-8, atol=1e-8)


def test_the_negative_binomial_by_hand() -> None:
    """T = 2, V = 4 gives A = 1, a geometric law: P(3) = (1/3) (2/3)^3."""
    assert one(ln_negative_binomial, 3.0, 2.0, 4.0) == pytest.approx(math.log((1 / 3) * (2 / 3) ** 3))


def test_the_negative_binomial_keeps_its_digits_at_any_shape() -> None:
    generator = np.random.default_rng(23)
    for _ in range(60):
        expected = 10.0 ** generator.uniform(-6, 6)
        variance = expected**2 * 10.0 ** generator.uniform(-20, 2)
        n = float(generator.poisson(2.0 * expected))
        truth = many_digits_noisy(n, expected, variance)
        assert one(ln_negative_binomial, n, expected, variance) == pytest.approx(truth, rel=1e-12, abs=1e-12)


@pytest.mark.parametrize("relative_variance", [1e-20, 1e-28, 1e-32, 1e-100, 0.0])
def test_without_template_errors_the_law_is_poisson(relative_variance: float) -> None:
    """A template error of 1e-15 once gave digits of nothing: A = 1e30 swallowed the count."""
    n, expected = np.array([0.0, 3.0, 40.0, 1e5]), np.array([1.5, 2.0, 33.0, 1.001e5])
    variance = relative_variance * expected**2
    found = bin_ln_probability(expected, variance, n)
    np.testing.assert_allclose(found, ln_poisson(n, expected), rtol=1e-9)
    noisy, plain = negative_binomial_slopes(n, expected, variance), poisson_slopes(n, expected)
    np.testing.assert_allclose(noisy.t, plain.t, rtol=1e-9, atol=1e-12)
    np.testing.assert_allclose(noisy.tt, plain.tt, rtol=1e-9, atol=1e-12)


def test_poisson_slopes_equal_differences() -> None:
    n, expected = np.array([0.0, 1.0, 7.0, 250.0]), np.array([0.4, 2.0, 6.5, 260.0])
    step = 1e-4 * expected
    up, at, down = (ln_poisson(n, expected + sign * step) for sign in (1.0, 0.0, -1.0))
    slopes = poisson_slopes(n, expected)
    np.testing.assert_allclose(slopes.t, (up - down) / (2 * step), rtol=1e-6)
    np.testing.assert_allclose(slopes.tt, (up - 2 * at + down) / step**2, rtol=1e-4, atol=1e-6)


@pytest.mark.parametrize("relative_variance", [1e-8, 1e-3, 0.03, 0.07, 1.0, 50.0])
def test_negative_binomial_slopes_equal_differences(relative_variance: float) -> None:
    """On both sides of A = 16, where digammas give way to their series."""
    n, t = np.array([0.0, 1.0, 9.0, 30.0, 300.0]), np.array([0.7, 2.5, 6.0, 40.0, 280.0])
    v = relative_variance * t * t

    def slopes(scale_t: float, scale_v: float) -> list[Array]:
        found = negative_binomial_slopes(n, scale_t * t, scale_v * v)
        return [ln_negative_binomial(n, scale_t * t, scale_v * v), found.t, found.v]

    h = 1e-5
    value_t, t_t, v_t = (
        (a - b) / (2 * h * t) for a, b in zip(slopes(1 + h, 1), slopes(1 - h, 1), strict=True)
    )
    value_v, _, v_v = ((a - b) / (2 * h * v) for a, b in zip(slopes(1, 1 + h), slopes(1, 1 - h), strict=True))
    found = negative_binomial_slopes(n, t, v)
    np.testing.assert_allclose(found.t, value_t, rtol=2e-6, atol=1e-7)
    np.testing.assert_allclose(found.v * v, value_v * v, rtol=2e-6, atol=1e-7)
    np.testing.assert_allclose(found.tt, t_t, rtol=2e-6, atol=1e-7)
    np.testing.assert_allclose(found.tv * v, v_t * v, rtol=2e-6, atol=1e-7)
    np.testing.assert_allclose(found.vv * v * v, v_v * v * v, rtol=2e-6, atol=1e-7)


def test_slopes_are_finite_wherever_an_expectation_ends_up() -> None:
    """An expectation of 1e-200 with a count once overflowed to an infinite slope."""
    t, relative, n = (
        axis.ravel()
        for axis in np.meshgrid(
            [0.0, 1e-320, 1e-200, 1e-45, 1e-30, 1e-9, 1.0, 1e9, 1e100],
            [0.0, 1e-300, 1e-31, 1e-29, 1.0, 1e20],
            [0.0, 1.0, 1e6, 1e15],
        )
    )
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        variance = np.minimum(relative * t * t, 1e200)
        found = negative_binomial_slopes(n, t, variance)
        value = bin_ln_probability(t, variance, n)
        plain = poisson_slopes(n, t)
    for slope in (found.t, found.tt, found.v, found.vv, found.tv, plain.t, plain.tt):
        assert np.isfinite(slope).all()
    assert not np.isnan(value).any()
    assert (value <= 1e-9).all()
