"""From a standard-normal coordinate to a parameter: quantiles of the contract's priors, by scipy alone."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.hypotheses.priors import (
    Beta,
    Exponential,
    Gamma,
    HalfNormal,
    LogNormal,
    LogUniform,
    Normal,
    Prior,
    Uniform,
)

Array = npt.NDArray[np.float64]


def quantile(prior: Prior, t: Array) -> Array:
    """Return x with P(parameter < x) = Phi(t), from the nearer tail."""
    below, above = special.ndtr(t), special.ndtr(-t)
    match prior:
        case Uniform():
            x = prior.low + (prior.high - prior.low) * below
        case LogUniform():
            x = prior.low * (prior.high / prior.low) ** below
        case Exponential():
            x = -prior.mean * special.log_ndtr(-t)
        case HalfNormal():
            x = -prior.sd * special.ndtri(0.5 * above)
        case LogNormal():
            x = prior.median * prior.factor**t
        case Gamma():
            x = _split(t, special.gammaincinv, special.gammainccinv, prior.shape) / prior.rate
        case Beta():
            upper = 1.0 - special.betaincinv(prior.b, prior.a, above)
            part = np.where(t < 0.0, special.betaincinv(prior.a, prior.b, below), upper)
            x = prior.low + (prior.high - prior.low) * part
        case Normal():
            x = prior.mean + prior.sd * _cut(prior, t)
        case _:
            raise TypeError(f"no quantile for {prior}")
    return np.asarray(x)


def _split(t: Array, lower: np.ufunc, upper: np.ufunc, shape: float) -> Array:
    """Return an inverse from the lower tail below the median and from the upper one above."""
    x = np.empty_like(t)
    low = t < 0.0
    x[low] = lower(shape, special.ndtr(t[low]))
    x[~low] = upper(shape, special.ndtr(-t[~low]))
    return x


def _cut(prior: Normal, t: Array) -> Array:
    """Return the standardised normal, cut off at its ends where it has any."""
    if prior.low is None and prior.high is None:
        return t
    first = 0.0 if prior.low is None else special.ndtr((prior.low - prior.mean) / prior.sd)
    last = 0.0 if prior.high is None else special.ndtr((prior.mean - prior.high) / prior.sd)
    inside = 1.0 - first - last
    upper = -special.ndtri(last + inside * special.ndtr(-t))
    return np.asarray(np.where(t < 0.0, special.ndtri(first + inside * special.ndtr(t)), upper))
