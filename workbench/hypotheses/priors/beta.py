"""The beta prior on a finite range."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

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
    ContinuousPrior,
    Moments,
    as_array,
    numbers_faults,
    positive_fault,
    range_fault,
    refuse,
    standard_from_tails,
)


@dataclass(frozen=True, slots=True)
class Beta(ContinuousPrior):
    """Beta with exponents a and b, stretched over low to high.

    Attributes:
        a: exponent at the lower end: the density goes like y**(a - 1) there; > 0.
        b: exponent at the upper end; > 0.
        low: lower end.
        high: upper end, above it.
    """

    family: ClassVar[str] = "beta"
    a: float
    b: float
    low: float = 0.0
    high: float = 1.0

    def __post_init__(self) -> None:
        refuse(
            self.family,
            *numbers_faults(a=self.a, b=self.b, low=self.low, high=self.high),
            positive_fault("a", self.a),
            positive_fault("b", self.b),
            range_fault(self.low, self.high),
        )

    @property
    def support(self) -> tuple[float, float]:
        """Return low and high."""
        return (self.low, self.high)

    @property
    def moments(self) -> Moments:
        """Return low + (high - low) a/(a + b), and (high - low) sqrt(a b/(a + b + 1))/(a + b)."""
        total, width = self.a + self.b, self.high - self.low
        spread = float(np.sqrt(self.a * self.b / (total + 1.0))) / total
        return Moments(self.low + width * self.a / total, width * spread)

    @property
    def is_flat(self) -> bool:
        """Tell whether both exponents are 1, the uniform prior."""
        return self.a == 1.0 and self.b == 1.0

    def _parts(self, t: Array) -> tuple[Array, Array]:
        """Return ln y and ln(1 - y) of the beta quantile y, each exact where it is small."""
        tail = special.ndtr(-np.abs(t))
        lower = np.where(
            t < 0.0, special.betaincinv(self.a, self.b, tail), special.betainccinv(self.a, self.b, tail)
        )
        upper = np.where(
            t < 0.0, special.betainccinv(self.b, self.a, tail), special.betaincinv(self.b, self.a, tail)
        )
        ln_beta = special.betaln(self.a, self.b)
        ln_lower_end = (special.log_ndtr(t) + np.log(self.a) + ln_beta) / self.a
        ln_upper_end = (special.log_ndtr(-t) + np.log(self.b) + ln_beta) / self.b
        at_lower, at_upper = ln_lower_end < SERIES_BELOW, ln_upper_end < SERIES_BELOW
        # The inverse of the part next to 1 may fail where the other part is this small.
        ln_lower = np.log(np.maximum(np.where(at_upper, 1.0, lower), TINY))
        ln_upper = np.log(np.maximum(np.where(at_lower, 1.0, upper), TINY))
        return np.where(at_lower, ln_lower_end, ln_lower), np.where(at_upper, ln_upper_end, ln_upper)

    def _rate(self, t: Array, ln_y: Array, ln_rest: Array) -> Array:
        """Return (dy/dt)/(y (1 - y))."""
        ln_rate = -0.5 * t * t - LN_SQRT_TWO_PI - self.a * ln_y - self.b * ln_rest
        rate: Array = np.exp(ln_rate + special.betaln(self.a, self.b))
        return rate

    def from_standard(self, t: npt.ArrayLike) -> Derivatives:
        """Return the beta quantile of Phi(t) with derivatives."""
        u = as_array(t)
        held = np.clip(u, -TAIL_KNOWN, TAIL_KNOWN)
        ln_y, ln_rest = self._parts(held)
        if np.any(held != u):
            step = (u - held) * self._rate(held, ln_y, ln_rest)
            ln_y, ln_rest = ln_y + step * np.exp(ln_rest), ln_rest - step * np.exp(ln_y)
        y, rest, rate = np.exp(ln_y), np.exp(ln_rest), self._rate(u, ln_y, ln_rest)
        width = self.high - self.low
        slope = width * y * rest * rate
        bend = slope * (-u - (self.a - 1.0) * rest * rate + (self.b - 1.0) * y * rate)
        near_low = self.low + width * np.maximum(y, TINY)
        x = np.where(y < rest, near_low, self.high - width * np.maximum(rest, TINY))
        return Derivatives(np.clip(x, self.low, self.high), slope, bend)

    def _fractions(self, x: npt.ArrayLike) -> tuple[Array, Array]:
        place, width = as_array(x), self.high - self.low
        return (
            np.clip((place - self.low) / width, 0.0, 1.0),
            np.clip((self.high - place) / width, 0.0, 1.0),
        )

    def to_standard(self, x: npt.ArrayLike) -> Array:
        """Return t of x."""
        y, rest = self._fractions(x)
        below = np.where(y < 0.5, special.betainc(self.a, self.b, y), special.betaincc(self.b, self.a, rest))
        above = np.where(y < 0.5, special.betaincc(self.a, self.b, y), special.betainc(self.b, self.a, rest))
        return standard_from_tails(below, above)

    def ln_density(self, x: npt.ArrayLike) -> Array:
        """Return the ln of the stretched beta density."""
        place = as_array(x)
        y, rest = self._fractions(x)
        with np.errstate(divide="ignore"):
            inner = special.xlogy(self.a - 1.0, y) + special.xlogy(self.b - 1.0, rest)
        inside = (place >= self.low) & (place <= self.high)
        norm = special.betaln(self.a, self.b) + np.log(self.high - self.low)
        return np.where(inside, inner - norm, -np.inf)

    def fit_penalty(self, x: npt.ArrayLike) -> Derivatives:
        """Return (a - 1) ln y + (b - 1) ln(1 - y), 0 at its largest."""
        y, rest = (np.maximum(part, TINY**0.5) for part in self._fractions(x))
        p, q, width = self.a - 1.0, self.b - 1.0, self.high - self.low
        peak = 0.0
        if p >= 0.0 and q >= 0.0 and p + q > 0.0:
            peak = float(special.xlogy(p, p / (p + q)) + special.xlogy(q, q / (p + q)))
        value = special.xlogy(p, y) + special.xlogy(q, rest) - peak
        return Derivatives(value, (p / y - q / rest) / width, -(p / y**2 + q / rest**2) / width**2)

    def text(self) -> str:
        """Return the prior in words."""
        return f"beta {self.a:g}, {self.b:g} from {self.low:g} to {self.high:g}"
