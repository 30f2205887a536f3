"""Priors that are a range and nothing else: uniform, log-uniform; and the parameter that is held."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import ClassVar, Self

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.hypotheses.jets import Derivatives
from workbench.hypotheses.priors.family import (
    Array,
    ContinuousPrior,
    Moments,
    as_array,
    normal_density,
    numbers_faults,
    positive_fault,
    range_fault,
    refuse,
    standard_from_tails,
)


def _from_nearer_end(low: float, high: float, t: Array) -> Array:
    """Return low + (high - low) Phi(t), measured from the nearer end."""
    part: Array = (high - low) * special.ndtr(-np.abs(t))
    return np.clip(np.where(t < 0.0, low + part, high - part), low, high)


@dataclass(frozen=True, slots=True)
class Uniform(ContinuousPrior):
    """Uniform between low and high.

    Attributes:
        low: lower end.
        high: upper end, above it.
    """

    family: ClassVar[str] = "uniform"
    low: float
    high: float

    def __post_init__(self) -> None:
        refuse(self.family, *numbers_faults(low=self.low, high=self.high), range_fault(self.low, self.high))

    @property
    def support(self) -> tuple[float, float]:
        """Return low and high."""
        return (self.low, self.high)

    @property
    def moments(self) -> Moments:
        """Return the middle, and the range over the root of 12."""
        return Moments(0.5 * (self.low + self.high), (self.high - self.low) / float(np.sqrt(12.0)))

    @property
    def is_flat(self) -> bool:
        """Return True: a range and nothing else."""
        return True

    def from_standard(self, t: npt.ArrayLike) -> Derivatives:
        """Return x = low + (high - low) Phi(t) with derivatives."""
        u = as_array(t)
        slope = (self.high - self.low) * normal_density(u)
        return Derivatives(_from_nearer_end(self.low, self.high, u), slope, -u * slope)

    def to_standard(self, x: npt.ArrayLike) -> Array:
        """Return t of x."""
        place, width = as_array(x), self.high - self.low
        return standard_from_tails((place - self.low) / width, (self.high - place) / width)

    def ln_density(self, x: npt.ArrayLike) -> Array:
        """Return -ln(high - low) inside."""
        place = as_array(x)
        inside = (place >= self.low) & (place <= self.high)
        return np.where(inside, -np.log(self.high - self.low), -np.inf)

    def fit_penalty(self, x: npt.ArrayLike) -> Derivatives:
        """Return zeros."""
        zero = np.zeros(np.shape(x))
        return Derivatives(zero, zero, zero)

    def scaled(self, factor: float) -> Self | None:
        """Return the range scaled with its low end kept."""
        return replace(self, high=self.low + factor * (self.high - self.low))

    def text(self) -> str:
        """Return the prior in words."""
        return f"uniform from {self.low:g} to {self.high:g}"


@dataclass(frozen=True, slots=True)
class LogUniform(ContinuousPrior):
    """Uniform in ln x between low and high.

    Attributes:
        low: lower end; > 0.
        high: upper end, above it.
    """

    family: ClassVar[str] = "loguniform"
    low: float
    high: float

    def __post_init__(self) -> None:
        refuse(
            self.family,
            *numbers_faults(low=self.low, high=self.high),
            positive_fault("low", self.low),
            range_fault(self.low, self.high),
        )

    @property
    def support(self) -> tuple[float, float]:
        """Return low and high."""
        return (self.low, self.high)

    @property
    def _ln_range(self) -> float:
        near = self.high < 2.0 * self.low
        return float(
            np.log1p((self.high - self.low) / self.low) if near else np.log(self.high) - np.log(self.low)
        )

    @property
    def moments(self) -> Moments:
        """Return (high - low)/ln(high/low), and the root of the second moment less its square."""
        mean = (self.high - self.low) / self._ln_range
        square = mean * 0.5 * (self.high + self.low)
        return Moments(mean, float(np.sqrt(max(square - mean**2, 0.0))))

    @property
    def is_flat(self) -> bool:
        """Return True: a range in ln x and nothing else."""
        return True

    def from_standard(self, t: npt.ArrayLike) -> Derivatives:
        """Return x = low (high/low)**Phi(t) with derivatives."""
        u = as_array(t)
        part = self._ln_range * special.ndtr(-np.abs(u))
        x = np.clip(
            np.where(u < 0.0, self.low * np.exp(part), self.high * np.exp(-part)), self.low, self.high
        )
        rate = self._ln_range * normal_density(u)
        return Derivatives(x, x * rate, x * rate * (rate - u))

    def to_standard(self, x: npt.ArrayLike) -> Array:
        """Return t of x."""
        place = np.clip(as_array(x), self.low, self.high)
        near_low, near_high = place < 2.0 * self.low, place > 0.5 * self.high
        above = np.where(
            near_low,
            np.log1p((np.minimum(place, 2.0 * self.low) - self.low) / self.low),
            np.log(place) - np.log(self.low),
        )
        step = np.where(near_high, (place - self.high) / self.high, 0.0)
        below = np.where(near_high, -np.log1p(step), np.log(self.high) - np.log(place))
        return standard_from_tails(above / self._ln_range, below / self._ln_range)

    def ln_density(self, x: npt.ArrayLike) -> Array:
        """Return -ln x - ln ln(high/low) inside."""
        place = as_array(x)
        inside = (place >= self.low) & (place <= self.high)
        ln_place = np.log(np.where(inside, place, self.low))
        return np.where(inside, -ln_place - np.log(self._ln_range), -np.inf)

    def fit_penalty(self, x: npt.ArrayLike) -> Derivatives:
        """Return zeros: the density in ln x is flat."""
        zero = np.zeros(np.shape(x))
        return Derivatives(zero, zero, zero)

    def text(self) -> str:
        """Return the prior in words."""
        return f"log-uniform from {self.low:g} to {self.high:g}"


@dataclass(frozen=True, slots=True)
class Fixed:
    """A parameter held at one value: it has no coordinate.

    Attributes:
        value: the value.
    """

    family: ClassVar[str] = "fixed"
    value: float

    def __post_init__(self) -> None:
        refuse(self.family, *numbers_faults(value=self.value))

    @property
    def support(self) -> tuple[float, float]:
        """Return the value twice."""
        return (self.value, self.value)

    @property
    def moments(self) -> Moments:
        """Return the value and 0."""
        return Moments(self.value, 0.0)

    @property
    def mean(self) -> float:
        """Return the value."""
        return self.value

    @property
    def sd(self) -> float:
        """Return 0."""
        return 0.0

    @property
    def median(self) -> float:
        """Return the value."""
        return self.value

    @property
    def is_flat(self) -> bool:
        """Return False: there is no range."""
        return False

    def from_standard(self, t: npt.ArrayLike) -> Derivatives:  # noqa: ARG002
        """Raise: a held parameter has no standard coordinate.

        Raises:
            ValueError: always.
        """
        raise ValueError(f"a parameter held at {self.value:g} has no standard coordinate")

    def to_standard(self, x: npt.ArrayLike) -> Array:  # noqa: ARG002
        """Raise: a held parameter has no standard coordinate.

        Raises:
            ValueError: always.
        """
        raise ValueError(f"a parameter held at {self.value:g} has no standard coordinate")

    def ln_density(self, x: npt.ArrayLike) -> Array:
        """Return 0 at the value (probability, not density) and minus infinity elsewhere."""
        return np.where(as_array(x) == self.value, 0.0, -np.inf)

    def fit_penalty(self, x: npt.ArrayLike) -> Derivatives:
        """Return zeros."""
        zero = np.zeros(np.shape(x))
        return Derivatives(zero, zero, zero)

    def scaled(self, factor: float) -> Self | None:  # noqa: ARG002
        """Return None: there is no width."""
        return None

    def quantile(self, p: npt.ArrayLike) -> Array:
        """Return the value."""
        return np.full(np.shape(p), self.value)

    def text(self) -> str:
        """Return the prior in words."""
        return f"fixed at {self.value:g}"
