"""The gamma prior."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import ClassVar, Self

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.hypotheses.jets import Derivatives
from workbench.hypotheses.priors.family import (
    LN_SQRT_TWO_PI,
    SERIES_BELOW,
    TAIL_KNOWN,
    TINY,
    Array,
    Moments,
    as_array,
    numbers_faults,
    positive_fault,
    refuse,
    standard_from_tails,
)
from workbench.hypotheses.priors.scales import PositivePrior


@dataclass(frozen=True, slots=True)
class Gamma(PositivePrior):
    """Gamma with density proportional to x**(shape - 1) exp(-rate x).

    Attributes:
        shape: the shape; > 0.
        rate: the rate; > 0.
    """

    family: ClassVar[str] = "gamma"
    shape: float
    rate: float

    def __post_init__(self) -> None:
        refuse(
            self.family,
            *numbers_faults(shape=self.shape, rate=self.rate),
            positive_fault("shape", self.shape),
            positive_fault("rate", self.rate),
        )

    @property
    def moments(self) -> Moments:
        """Return shape/rate and sqrt(shape)/rate."""
        return Moments(self.shape / self.rate, self.shape**0.5 / self.rate)

    def _ln_inside(self, t: Array) -> Array:
        """Return ln(rate x); the first term of the power series where rate x would underflow."""
        tail = special.ndtr(-np.abs(t))
        inside = np.where(
            t < 0.0, special.gammaincinv(self.shape, tail), special.gammainccinv(self.shape, tail)
        )
        ln_end: Array = (special.log_ndtr(t) + special.gammaln(self.shape + 1.0)) / self.shape
        return np.where(ln_end < SERIES_BELOW, ln_end, np.log(np.maximum(inside, TINY)))

    def _ln_slope(self, t: Array, ln_y: Array) -> Array:
        """Return d ln(rate x)/dt."""
        ln_slope = -0.5 * t * t - LN_SQRT_TWO_PI + special.gammaln(self.shape) - self.shape * ln_y
        slope: Array = np.exp(ln_slope + np.exp(ln_y))
        return slope

    def from_standard(self, t: npt.ArrayLike) -> Derivatives:
        """Return the gamma quantile of Phi(t) with derivatives."""
        u = as_array(t)
        held = np.clip(u, -TAIL_KNOWN, TAIL_KNOWN)
        ln_y = self._ln_inside(held)
        if np.any(held != u):
            slope = self._ln_slope(held, ln_y)
            bend = slope * (-held - (self.shape - np.exp(ln_y)) * slope)
            series = ln_y + (u - held) * (slope + 0.5 * (u - held) * bend)
            ln_y = np.where(held == u, ln_y, series)
        y, rate = np.exp(ln_y), self._ln_slope(u, ln_y)
        first = y * rate / self.rate
        second = first * (-u - (self.shape - 1.0 - y) * rate)
        return Derivatives(np.maximum(y, TINY) / self.rate, first, second)

    def to_standard(self, x: npt.ArrayLike) -> Array:
        """Return t of x."""
        y = np.maximum(as_array(x) * self.rate, 0.0)
        return standard_from_tails(special.gammainc(self.shape, y), special.gammaincc(self.shape, y))

    def ln_density(self, x: npt.ArrayLike) -> Array:
        """Return the gamma ln density."""
        place = as_array(x)
        y = np.maximum(place * self.rate, 0.0)
        with np.errstate(divide="ignore"):
            inner = special.xlogy(self.shape - 1.0, y) - y - special.gammaln(self.shape) + np.log(self.rate)
        return np.where(place >= 0.0, inner, -np.inf)

    def fit_penalty(self, x: npt.ArrayLike) -> Derivatives:
        """Return (shape - 1) ln(rate x) - rate x, 0 at its largest."""
        y = np.maximum(as_array(x) * self.rate, TINY**0.25)
        power = self.shape - 1.0
        peak = float(special.xlogy(power, power) - power) if power > 0.0 else 0.0
        value = special.xlogy(power, y) - y - peak
        return Derivatives(value, (power / y - 1.0) * self.rate, -power / y**2 * self.rate**2)

    def scaled(self, factor: float) -> Self | None:
        """Return the gamma with its sd scaled and its mean kept."""
        return replace(self, shape=self.shape / factor**2, rate=self.rate / factor**2)

    def text(self) -> str:
        """Return the prior in words."""
        return f"gamma with shape {self.shape:g}, rate {self.rate:g}"
