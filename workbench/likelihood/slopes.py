"""How the probability of a count changes with its expectation and with that expectation's variance."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.likelihood.laws import log_gap, noisy_bins

Array = npt.NDArray[np.float64]

_TINY = 1e-140  # its square, a large count's inverse and a slope squared still fit in double precision
_SMALLEST_SHAPE = 1e-100  # its inverse square is finite
_LARGE = 16.0
# psi(x) - ln x + 1/(2x) = -1/(12 x^2) + 1/(120 x^4) - ...
_DIGAMMA = (-1.0 / 12.0, 1.0 / 120.0, -1.0 / 252.0, 1.0 / 240.0, -1.0 / 132.0, 691.0 / 32760.0)


@dataclass(frozen=True, slots=True, eq=False)
class Slopes:
    """Derivatives of the ln probability of each bin in its expectation T and variance V.

    Attributes:
        t, tt: (..., bin) first and second in T.
        v, vv: (..., bin) first and second in V.
        tv: (..., bin) mixed.
    """

    t: Array
    tt: Array
    v: Array
    vv: Array
    tv: Array


def poisson_slopes(n: Array, expected: Array) -> Slopes:
    """Return the first two derivatives of the ln Poisson probability in its expectation.

    Args:
        n: (..., bin) counted events [events].
        expected: (..., bin) T [events]; >= 0.

    Returns:
        Slopes with t = n/T - 1 and tt = -n/T^2, always finite.

    Limits:
        T below 1e-140 is taken as 1e-140, where the ln probability of any count is below -300.
    """
    floored = np.maximum(expected, _TINY)
    ratio = n / floored
    nothing = np.zeros(1)
    return Slopes(ratio - 1.0, -ratio / floored, nothing, nothing, nothing)


def negative_binomial_slopes(n: Array, expected: Array, variance: Array) -> Slopes:
    """Return the first two derivatives of the ln negative binomial in its mean T and variance part V.

    Derivatives in (T, A) follow from the closed form; A = T^2/V then carries them to (T, V).

    Args:
        n: (..., bin) counted events [events].
        expected: (..., bin) T [events]; >= 0.
        variance: (..., bin) V [events^2]; >= 0; bins with V = 0 are Poisson.

    Returns:
        Slopes with all five derivatives; those in V are 0 where V = 0.
    """
    plain = poisson_slopes(n, expected)
    noisy = noisy_bins(expected, variance)
    t, v = np.where(noisy, expected, 1.0), np.where(noisy, variance, 1.0)
    a = np.maximum(t * t / v, _SMALLEST_SHAPE)
    at = a + t
    f_t = a * (n - t) / (t * at)
    f_tt = -n / (t * t) + (a + n) / (at * at)
    f_ta = (n - t) / (at * at)
    f_a, f_aa = _shape_slopes(n, t, a)
    a_t, a_v = 2.0 * a / t, -a / v
    a_tt, a_tv, a_vv = 2.0 / v, -2.0 * a / t / v, 2.0 * a / v / v
    first_t = f_t + f_a * a_t
    second_tt = f_tt + 2.0 * f_ta * a_t + f_aa * a_t**2 + f_a * a_tt
    second_tv = f_ta * a_v + f_aa * a_t * a_v + f_a * a_tv
    second_vv = f_aa * a_v * a_v + f_a * a_vv
    return Slopes(
        np.where(noisy, first_t, plain.t),
        np.where(noisy, second_tt, plain.tt),
        np.where(noisy, f_a * a_v, 0.0),
        np.where(noisy, second_vv, 0.0),
        np.where(noisy, second_tv, 0.0),
    )


def _shape_slopes(n: Array, t: Array, a: Array) -> tuple[Array, Array]:
    """Return the first two derivatives in A at fixed T.

    From digamma differences where A is small; where it is large these lose all digits, and the asymptotic
    series of both digammas, their logarithms gathered in x - ln(1 + x) with x = (n - T)/(A + T), does not.
    """
    is_small = a < _LARGE
    large = np.where(is_small, _LARGE, a)
    first, second = _series_slopes(n + np.zeros_like(large), t, large)
    if not is_small.any():
        return first, second
    small = np.where(is_small, a, _LARGE)
    at = small + t
    direct = special.digamma(n + small) - special.digamma(small) - np.log1p(t / small) + (t - n) / at
    bent = (
        special.polygamma(1, n + small) - special.polygamma(1, small) + t / (small * at) - (t - n) / (at * at)
    )
    return np.where(is_small, direct, first), np.where(is_small, bent, second)


def _series_slopes(n: Array, t: Array, a: Array) -> tuple[Array, Array]:
    shifted = a + n
    x = (n - t) / (a + t)
    tail, bend = _digamma_tail(a)
    shifted_tail, shifted_bend = _digamma_tail(shifted)
    first = -log_gap(x, shifted / (a + t)) + n / (2.0 * a * shifted) + (shifted_tail - tail)
    second = x * x / shifted - n * (a + shifted) / (2.0 * (a * shifted) ** 2) + (shifted_bend - bend)
    return first, second


def _digamma_tail(x: Array) -> tuple[Array, Array]:
    """Return psi(x) - ln x + 1/(2x) and its derivative for large x."""
    square = 1.0 / (x * x)
    value, slope = np.zeros_like(x), np.zeros_like(x)
    for order in range(len(_DIGAMMA) - 1, -1, -1):
        value = value * square + _DIGAMMA[order]
        slope = slope * square - 2.0 * (order + 1) * _DIGAMMA[order]
    return value * square, slope * square / x
