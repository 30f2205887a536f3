"""Laws of counts whose mean is not known: the Poisson law averaged over a prior, in closed form."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.likelihood.laws import ln_negative_binomial, ln_poisson

Array = npt.NDArray[np.float64]
CountLaw = Callable[[Array], Array]

_SAFE = 1e-280  # below this, an incomplete gamma function is too near underflow for its logarithm


def ln_gamma_mixture(counts: npt.ArrayLike, shape: float, rate: float) -> Array:
    """Return the ln probability of counts whose mean has a gamma prior.

    With n ~ Poisson(m), m ~ gamma(shape a, rate r):
        P(n) = Gamma(n + a)/(n! Gamma(a)) (r/(1 + r))^a (1 + r)^-n

    Args:
        counts: (...) n [events]; integers >= 0.
        shape: a; > 0. 1 is the exponential prior of mean 1/r.
        rate: r [1/events]; > 0.

    Returns:
        (...) ln probability [nats].

    Source:
        Gamma-Poisson mixture (negative binomial), elementary.
    """
    counts = np.asarray(counts, dtype=float)
    mean = np.full_like(counts, shape / rate)
    return ln_negative_binomial(counts, mean, mean / rate)


def ln_uniform_mixture(counts: npt.ArrayLike, low: float, high: float) -> Array:
    """Return the ln probability of counts whose mean is uniform between two limits.

    With P and Q = 1 - P the regularised incomplete gamma functions:
        P(n) = [ P(n + 1, high) - P(n + 1, low) ]/(high - low)

    Args:
        counts: (...) n [events]; integers >= 0.
        low: lower limit [events]; >= 0.
        high: upper limit [events]; > low.

    Returns:
        (...) ln probability [nats].

    Limits:
        Loses digits where (high - low)/high is near rounding; the mean is then as good as known.

    Source:
        Elementary gamma integral.
    """
    counts = np.asarray(counts, dtype=float)
    at_low, at_high = np.full_like(counts, low), np.full_like(counts, high)
    below = _ln_difference(_ln_lower(counts, at_high), _ln_lower(counts, at_low))
    above = _ln_difference(ln_upper_gamma(counts, at_low), ln_upper_gamma(counts, at_high))
    return np.asarray(np.where(counts > 0.5 * (low + high), below, above) - np.log(high - low))


def _ln_difference(larger: Array, smaller: Array) -> Array:
    """Return ln(exp(larger) - exp(smaller))."""
    with np.errstate(divide="ignore", invalid="ignore"):  # -inf and equal ones occur on the side not chosen
        return np.asarray(np.where(smaller == -np.inf, larger, larger + np.log(-np.expm1(smaller - larger))))


def _ln_lower(counts: Array, at: Array) -> Array:
    """Return ln P(n + 1, x), by its series where P underflows."""
    direct = special.gammainc(counts + 1.0, at)
    tiny = (direct < _SAFE) & (at > 0.0) & (at < counts + 1.0)
    where = np.where(tiny, at, 0.0)
    with np.errstate(divide="ignore"):
        series = ln_poisson(counts + 1.0, where) + np.log(special.hyp1f1(1.0, counts + 2.0, where))
        return np.asarray(np.where(tiny, series, np.log(direct)))


def ln_upper_gamma(counts: Array, at: Array) -> Array:
    """Return ln Q(n + 1, x), by its finite sum where Q underflows.

    Q is the regularised upper incomplete gamma function, the probability of at most n counts when x are
    expected:
        Q(n + 1, x) = sum over k = 0..n of Poisson(k | x)

    Args:
        counts: (...) n; integers >= 0.
        at: (...) x; >= 0, of the same shape.

    Returns:
        (...) ln Q [nats].

    Source:
        Poisson sum, elementary.
    """
    direct = special.gammaincc(counts + 1.0, at)
    with np.errstate(divide="ignore"):
        found = np.asarray(np.log(direct))
    for place in np.argwhere((direct < _SAFE) & np.isfinite(at)):
        index = tuple(place)
        terms = ln_poisson(np.arange(counts[index] + 1.0), np.asarray(at[index]))
        found[index] = special.logsumexp(terms)
    return found


def ln_sum_of_two(observed: int, first: CountLaw, second: CountLaw) -> float:
    """Return the ln probability of a count to which two sources contribute.

    P(n) = sum over k = 0..n of P_first(k) P_second(n - k)

    Args:
        observed: n [events].
        first: law of the first source: (k,) counts to (k,) ln probabilities.
        second: law of the second source.

    Returns:
        ln probability [nats].

    Limits:
        Takes memory and time proportional to n: meant for n up to about 1e7.

    Source:
        Convolution, elementary.
    """
    counts = np.arange(observed + 1.0)
    return float(special.logsumexp(first(counts) + second(counts[::-1])))
