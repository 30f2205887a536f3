"""The probability of counts: Poisson, and negative binomial where templates carry statistical errors."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
from scipy import special

Array = npt.NDArray[np.float64]
Flags = npt.NDArray[np.bool_]

_LN_2PI = float(np.log(2.0 * np.pi))
_STIRLING = (1.0 / 12.0, -1.0 / 360.0, 1.0 / 1260.0, -1.0 / 1680.0, 1.0 / 1188.0)
_LARGE = 16.0
_LARGEST_PLAIN_COUNT = 1e5
_NEAR = 0.2
_SMALLEST_NOISY_MEAN = 1e-40
_SMALLEST_RELATIVE_VARIANCE = 1e-30


def stirling_error(n: Array) -> Array:
    """Return ln n! minus Stirling's formula, exact to rounding for any n > 0.

    With d(n) = ln n! - [ (n + 1/2) ln n - n + ln(2 pi)/2 ].

    Args:
        n: (...) numbers; > 0.

    Returns:
        (...) the correction d(n) [nats].

    Source:
        C. Loader, Fast and accurate computation of binomial probabilities (2000); from memory.
    """
    n = np.asarray(n, dtype=float)
    is_small = n < _LARGE
    large = np.where(is_small, _LARGE, n)
    inverse = 1.0 / large
    square = inverse * inverse
    series = np.zeros_like(large)
    for coefficient in reversed(_STIRLING):
        series = series * square + coefficient
    series *= inverse
    if not is_small.any():
        return series
    small = np.where(is_small, n, _LARGE)
    direct = special.gammaln(small + 1.0) - (small + 0.5) * np.log(small) + small - 0.5 * _LN_2PI
    return np.where(is_small, direct, series)


def log_gap(x: Array, whole: Array) -> Array:
    """Return x - ln(1 + x), exact to rounding also near 0 and near -1.

    With r = x/(2 + x):
        x - ln(1 + x) = x r - 2 r^3 (1/3 + r^2/5 + r^4/7 + ...)

    Args:
        x: (...) numbers; >= -1.
        whole: (...) 1 + x, worked out without adding 1: near x = -1 the sum has lost its digits.

    Returns:
        (...) the gap; >= 0, infinite at -1.

    Source:
        ln(1 + x) = 2 artanh(x/(2 + x)), as in C. Loader (2000), the function bd0; from memory.
    """
    is_near = np.abs(x) < _NEAR
    near = np.where(is_near, x, 0.0)
    ratio = near / (2.0 + near)
    square = ratio * ratio
    series = np.zeros_like(near)
    for power in range(8, -1, -1):
        series = series * square + 1.0 / (2.0 * power + 3.0)
    series = near * ratio - 2.0 * ratio * square * series
    if is_near.all():
        return series
    with np.errstate(divide="ignore"):  # at -1 the gap is infinite
        return np.where(is_near, series, x - np.log(whole))


def half_deviance(n: Array, expected: Array) -> Array:
    """Return n ln(n/v) + v - n without cancellation (v for n = 0).

    Args:
        n: (..., bin) counts or other numbers [events]; >= 0.
        expected: (..., bin) v [events]; >= 0.

    Returns:
        (..., bin) half the deviance of each bin [nats]; >= 0, infinite where v = 0 and n > 0.

    Source:
        C. Loader (2000), the function bd0; from memory. Written as n [x - ln(1 + x)] with x = (v - n)/n.
    """
    positive = np.where(n > 0.0, n, 1.0)
    gap = log_gap((expected - positive) / positive, expected / positive)
    return np.where(n > 0.0, positive * gap, expected)


def ln_poisson(n: Array, expected: Array) -> Array:
    """Return the ln Poisson probability of counts, exact from 1e-9 expected to 1e15 counted.

    ln P = -d(n) - [n ln(n/v) + v - n] - ln(2 pi n)/2, and -v for n = 0.

    Args:
        n: (..., bin) counted events [events]; integers >= 0.
        expected: (..., bin) v [events]; >= 0.

    Returns:
        (..., bin) ln probability [nats]; -inf where v = 0 and n > 0.

    Limits:
        Differences of two of these lose digits at huge counts: take n log1p(s/b) - s for a ratio.

    Source:
        C. Loader, Fast and accurate computation of binomial probabilities (2000); from memory.
    """
    n = np.asarray(n, dtype=float)
    return _ln_saturated(n) - half_deviance(n, np.asarray(expected, dtype=float))


def _ln_saturated(n: Array) -> Array:
    positive = np.where(n > 0.0, n, 1.0)
    return np.where(n > 0.0, -stirling_error(positive) - 0.5 * (_LN_2PI + np.log(positive)), 0.0)


def ln_saturated(n: Array) -> Array:
    """Return the ln probability of counts when every bin's expectation equals its count.

    Args:
        n: (..., bin) counted events [events]; integers >= 0.

    Returns:
        (...,) ln probability of the saturated model [nats].

    Source:
        None, definition.
    """
    return np.asarray(_ln_saturated(np.asarray(n, dtype=float)).sum(axis=-1))


def ln_negative_binomial(n: Array, expected: Array, variance: Array) -> Array:
    """Return the ln probability of counts whose expectation has a gamma-distributed relative error.

    n ~ Poisson(g T), g ~ gamma(shape A = T^2/V, rate A), integrated over g:
        P = Gamma(n + A)/(n! Gamma(A)) (A/(A + T))^A (T/(A + T))^n

    Args:
        n: (..., bin) counted events [events]; integers >= 0.
        expected: (..., bin) T [events]; > 0.
        variance: (..., bin) V, variance of T from the templates' own statistics [events^2]; > 0.

    Returns:
        (..., bin) ln probability [nats].

    Source:
        Gamma-Poisson mixture; evaluated by the saddle-point form of C. Loader (2000), from memory, its two
        deviances written with their small arguments (n - T)/(A + T) and A (T - n)/(n (A + T)).
    """
    shape = expected**2 / variance
    positive = np.where(n > 0.0, n, 1.0)
    total = positive + shape
    excess = (positive - expected) / (shape + expected)
    whole = total / (shape + expected)
    counted = (
        stirling_error(total)
        - stirling_error(shape)
        - stirling_error(positive)
        - shape * log_gap(excess, whole)
        - positive * log_gap(-excess * shape / positive, whole * expected / positive)
        + 0.5 * (np.log(shape) - np.log(total) - np.log(positive) - _LN_2PI)
    )
    return np.where(n > 0.0, counted, -shape * np.log1p(expected / shape))


def noisy_bins(expected: Array, variance: Array) -> Flags:
    """Return where the law differs from Poisson, so that the shape A = T^2/V is a number to work with.

    Args:
        expected: (..., bin) T [events]; >= 0.
        variance: (..., bin) V [events^2]; >= 0.

    Returns:
        (..., bin) False where V = 0, or so small beside T^2 or with T so small that nothing tells the two
        apart.
    """
    return (variance > _SMALLEST_RELATIVE_VARIANCE * expected * expected) & (expected > _SMALLEST_NOISY_MEAN)


def bin_ln_probability(expected: Array, variance: Array | None, counts: Array) -> Array:
    """Return the ln probability of each bin's count under the law in force.

    Args:
        expected: (..., bin) T [events]; >= 0.
        variance: (..., bin) V [events^2]; bins with 0 are Poisson; None when all are.
        counts: (bin,) or (..., bin) counted events [events].

    Returns:
        (..., bin) ln probability [nats]; -inf where T = 0 and a count is there.
    """
    if counts.max(initial=0.0) < _LARGEST_PLAIN_COUNT:
        with np.errstate(divide="ignore"):
            logs = np.log(expected)
        if not expected.all():  # 0 counted where 0 is expected is certain
            logs = np.where(counts > 0.0, logs, 0.0)
        plain = counts * logs - expected - special.gammaln(counts + 1.0)
    else:
        plain = ln_poisson(counts, expected)
    if variance is None:
        return np.asarray(plain)
    noisy = noisy_bins(expected, variance)
    t, v = np.where(noisy, expected, 1.0), np.where(noisy, variance, 1.0)
    return np.where(noisy, ln_negative_binomial(counts + np.zeros_like(t), t, v), plain)
