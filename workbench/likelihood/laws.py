"""The probability of counts: Poisson, and negative binomial where templates carry statistical errors."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy import special

Array = npt.NDArray[np.float64]

_LN_2PI = float(np.log(2.0 * np.pi))
_TINY = 1e-300
_STIRLING = (1.0 / 12.0, -1.0 / 360.0, 1.0 / 1260.0, -1.0 / 1680.0, 1.0 / 1188.0)
_LARGE = 16.0


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
    small = np.where(n < _LARGE, n, _LARGE)
    direct = special.gammaln(small + 1.0) - (small + 0.5) * np.log(small) + small - 0.5 * _LN_2PI
    large = np.where(n < _LARGE, _LARGE, n)
    inverse = 1.0 / large
    square = inverse * inverse
    series = np.zeros_like(large)
    for coefficient in reversed(_STIRLING):
        series = series * square + coefficient
    return np.where(n < _LARGE, direct, series * inverse)


def half_deviance(n: Array, expected: Array) -> Array:
    """Return n ln(n/v) + v - n without cancellation (v for n = 0).

    Args:
        n: (..., bin) counts or other numbers [events]; >= 0.
        expected: (..., bin) v [events]; > 0.

    Returns:
        (..., bin) half the deviance of each bin [nats]; >= 0.

    Source:
        C. Loader (2000), the function bd0; from memory. The form n (x - ln(1 + x)) with x = (v - n)/n has
        an absolute error of rounding times |v - n|.
    """
    excess = (expected - n) / np.where(n > 0.0, n, 1.0)
    with np.errstate(divide="ignore"):  # v = 0 with n > 0 is impossible: the deviance is infinite
        gap = excess - np.log1p(excess)
    return np.where(n > 0.0, n * gap, expected)


def ln_poisson(n: Array, expected: Array) -> Array:
    """Return the ln Poisson probability of counts, exact from 1e-9 expected to 1e15 counted.

    ln P = -d(n) - [n ln(n/v) + v - n] - ln(2 pi n)/2, and -v for n = 0.

    Args:
        n: (..., bin) counted events [events]; integers >= 0.
        expected: (..., bin) v [events]; >= 0.

    Returns:
        (..., bin) ln probability [nats]; -inf where v = 0 and n > 0.

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
        Gamma-Poisson mixture; evaluated by the saddle-point form of C. Loader (2000), from memory.
    """
    shape = expected**2 / variance
    positive = np.where(n > 0.0, n, 1.0)
    total = positive + shape
    counted = (
        stirling_error(total)
        - stirling_error(shape)
        - stirling_error(positive)
        - half_deviance(shape, total * shape / (shape + expected))
        - half_deviance(positive, total * expected / (shape + expected))
        + 0.5 * (np.log(total) - np.log(shape) - np.log(positive) - _LN_2PI)
        + np.log(shape / total)
    )
    return np.where(n > 0.0, counted, -shape * np.log1p(expected / shape))


@dataclass(frozen=True, slots=True, eq=False)
class Slopes:
    """Derivatives of the ln probability of each bin in its expectation T and variance V."""

    t: Array
    tt: Array
    v: Array
    vv: Array
    tv: Array


def poisson_slopes(n: Array, expected: Array) -> Slopes:
    """Return the first two derivatives of the ln Poisson probability in its expectation.

    Args:
        n: (..., bin) counted events [events].
        expected: (..., bin) T [events].

    Returns:
        Slopes with t = n/T - 1 and tt = -n/T^2.
    """
    ratio = n / np.maximum(expected, _TINY)
    nothing = np.zeros(1)
    return Slopes(ratio - 1.0, -ratio / np.maximum(expected, _TINY), nothing, nothing, nothing)


def negative_binomial_slopes(n: Array, expected: Array, variance: Array) -> Slopes:
    """Return the first two derivatives of the ln negative binomial in its mean T and variance part V.

    Derivatives in (T, A) follow from the closed form; A = T^2/V then carries them to (T, V).

    Args:
        n: (..., bin) counted events [events].
        expected: (..., bin) T [events]; > 0.
        variance: (..., bin) V [events^2]; >= 0; bins with V = 0 are Poisson.

    Returns:
        Slopes with all five derivatives; those in V are 0 where V = 0.
    """
    plain = poisson_slopes(n, expected)
    noisy = variance > 0.0
    t = np.maximum(expected, _TINY)
    v = np.where(noisy, variance, 1.0)
    a = t * t / v
    at = a + t
    f_t = a * (n - t) / (t * at)
    f_tt = -n / (t * t) + (a + n) / (at * at)
    f_ta = (n - t) / (at * at)
    f_a, f_aa = _shape_slopes(n, t, a)
    a_t, a_v = 2.0 * a / t, -a / v
    a_tt, a_tv, a_vv = 2.0 / v, -2.0 * a / (t * v), 2.0 * a / (v * v)
    first_t = f_t + f_a * a_t
    second_tt = f_tt + 2.0 * f_ta * a_t + f_aa * a_t**2 + f_a * a_tt
    second_tv = f_ta * a_v + f_aa * a_t * a_v + f_a * a_tv
    second_vv = f_aa * a_v**2 + f_a * a_vv
    return Slopes(
        np.where(noisy, first_t, plain.t),
        np.where(noisy, second_tt, plain.tt),
        np.where(noisy, f_a * a_v, 0.0),
        np.where(noisy, second_vv, 0.0),
        np.where(noisy, second_tv, 0.0),
    )


def _shape_slopes(n: Array, t: Array, a: Array) -> tuple[Array, Array]:
    """Return the first two derivatives in A at fixed T, by series where digamma differences lose digits."""
    scale = 1.0 + n + t
    series = a > 1e5 * scale
    safe = np.where(series, 1.0, a)
    at = safe + t
    first = special.digamma(n + safe) - special.digamma(safe) - np.log1p(t / safe) + (t - n) / at
    second = (
        special.polygamma(1, n + safe)
        - special.polygamma(1, safe)
        + t / (safe * at)
        - (t - n) / (at * at)
    )
    half = 0.5 * ((n - t) ** 2 - n)
    return np.where(series, -half / a**2, first), np.where(series, 2.0 * half / a**3, second)
