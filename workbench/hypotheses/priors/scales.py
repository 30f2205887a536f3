"""Priors on positive numbers: exponential, half-normal, log-normal."""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from typing import ClassVar, Self

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.counts.magnitudes import LARGEST_FACTOR, is_workable
from workbench.hypotheses.jets import Derivatives
from workbench.hypotheses.priors.family import (
    LN_SQRT_TWO_PI,
    ROOT_TWO,
    TINY,
    Array,
    ContinuousPrior,
    Moments,
    as_array,
    normal_density,
    numbers_faults,
    positive_fault,
    refuse,
    standard_from_ln_tails,
)

LN_TWO = float(np.log(2.0))


def _hazard(t: Array) -> Array:
    """Return phi(t)/Phi(-t), finite everywhere."""
    upper = np.sqrt(2.0 / np.pi) / special.erfcx(np.maximum(t, 0.0) / ROOT_TWO)
    lower: Array = normal_density(t) / special.ndtr(-np.minimum(t, 0.0))
    return np.where(t > 0.0, upper, lower)


class PositivePrior(ContinuousPrior):
    """A prior on the numbers above 0."""

    __slots__ = ()

    @property
    def support(self) -> tuple[float, float]:
        """Return 0 and infinity."""
        return (0.0, float("inf"))


@dataclass(frozen=True, slots=True)
class Exponential(PositivePrior):
    """Exponential with a mean.

    Attributes:
        mean: the mean; > 0.
    """

    family: ClassVar[str] = "exponential"
    mean: float = field()  # field() keeps the inherited property from being its default

    def __post_init__(self) -> None:
        refuse(self.family, *numbers_faults(mean=self.mean), positive_fault("mean", self.mean))

    @property
    def moments(self) -> Moments:
        """Return the mean twice."""
        return Moments(self.mean, self.mean)

    def from_standard(self, t: npt.ArrayLike) -> Derivatives:
        """Return x = -mean ln Phi(-t) with derivatives."""
        u = as_array(t)
        hazard = _hazard(u)
        return Derivatives(
            -self.mean * special.log_ndtr(-u), self.mean * hazard, self.mean * hazard * (hazard - u)
        )

    def to_standard(self, x: npt.ArrayLike) -> Array:
        """Return t of x."""
        reach = np.maximum(as_array(x) / self.mean, 0.0)
        with np.errstate(divide="ignore"):
            return standard_from_ln_tails(np.log(-np.expm1(-reach)), -reach)

    def ln_density(self, x: npt.ArrayLike) -> Array:
        """Return -x/mean - ln mean."""
        place = as_array(x)
        return np.where(place >= 0.0, -place / self.mean - np.log(self.mean), -np.inf)

    def fit_penalty(self, x: npt.ArrayLike) -> Derivatives:
        """Return -x/mean."""
        place = as_array(x)
        zero = np.zeros(place.shape)
        return Derivatives(-place / self.mean, zero - 1.0 / self.mean, zero)

    def scaled(self, factor: float) -> Self | None:
        """Return the exponential with its mean scaled."""
        return replace(self, mean=factor * self.mean)

    def text(self) -> str:
        """Return the prior in words."""
        return f"exponential with mean {self.mean:g}"


@dataclass(frozen=True, slots=True)
class HalfNormal(PositivePrior):
    """The positive half of a normal around 0.

    Attributes:
        sd: standard deviation of the whole normal; > 0. `moments` are those of the half.
    """

    family: ClassVar[str] = "halfnormal"
    sd: float = field()

    def __post_init__(self) -> None:
        refuse(self.family, *numbers_faults(sd=self.sd), positive_fault("sd", self.sd))

    @property
    def moments(self) -> Moments:
        """Return sd sqrt(2/pi) and sd sqrt(1 - 2/pi)."""
        part = 2.0 / float(np.pi)
        return Moments(self.sd * part**0.5, self.sd * (1.0 - part) ** 0.5)

    def from_standard(self, t: npt.ArrayLike) -> Derivatives:
        """Return x = sd u, where 2 Phi(u) - 1 = Phi(t), with derivatives."""
        t = as_array(t)
        below = ROOT_TWO * special.erfinv(special.ndtr(np.minimum(t, 0.0)))
        above = -special.ndtri_exp(special.log_ndtr(-np.maximum(t, 0.0)) - LN_TWO)
        u = np.where(t < 0.0, below, above)
        slope = 0.5 * np.exp(0.5 * (u - t) * (u + t))
        return Derivatives(self.sd * u, self.sd * slope, self.sd * slope * (u * slope - t))

    def to_standard(self, x: npt.ArrayLike) -> Array:
        """Return t of x."""
        u = np.maximum(as_array(x) / self.sd, 0.0)
        with np.errstate(divide="ignore"):
            return standard_from_ln_tails(np.log(special.erf(u / ROOT_TWO)), LN_TWO + special.log_ndtr(-u))

    def ln_density(self, x: npt.ArrayLike) -> Array:
        """Return ln 2 plus the normal ln density."""
        place = as_array(x)
        inner = LN_TWO - 0.5 * (place / self.sd) ** 2 - LN_SQRT_TWO_PI - np.log(self.sd)
        return np.where(place >= 0.0, inner, -np.inf)

    def fit_penalty(self, x: npt.ArrayLike) -> Derivatives:
        """Return -(x/sd)^2/2."""
        u = as_array(x) / self.sd
        return Derivatives(-0.5 * u * u, -u / self.sd, np.zeros(u.shape) - self.sd**-2)

    def scaled(self, factor: float) -> Self | None:
        """Return the half-normal with its sd scaled."""
        return replace(self, sd=factor * self.sd)

    def text(self) -> str:
        """Return the prior in words."""
        return f"half-normal with sd {self.sd:g}"


@dataclass(frozen=True, slots=True)
class LogNormal(PositivePrior):
    """ln x is normal.

    Attributes:
        median: the median; > 0.
        factor: what one standard deviation multiplies by; > 1.
    """

    family: ClassVar[str] = "lognormal"
    median: float = field()
    factor: float

    def __post_init__(self) -> None:
        refuse(
            self.family,
            *numbers_faults(median=self.median, factor=self.factor),
            positive_fault("median", self.median),
            (
                not self.factor > 1.0,
                "The prior's factor is not above 1",
                self.factor,
                "a number above 1: one standard deviation multiplies by it",
                "write 1.2 for twenty per cent",
            ),
            (
                is_workable(self.factor) and self.factor > LARGEST_FACTOR,
                "The prior's factor is above a million",
                self.factor,
                f"at most {LARGEST_FACTOR:,.0f}: one standard deviation multiplies by it",
                "narrow the prior, or use loguniform with a range",
            ),
        )

    @property
    def _ln_sd(self) -> float:
        return float(np.log(self.factor))

    @property
    def moments(self) -> Moments:
        """Return median exp(s^2/2), and that times sqrt(exp(s^2) - 1), with s = ln factor."""
        square = self._ln_sd**2
        mean = self.median * float(np.exp(0.5 * square))
        return Moments(mean, mean * float(np.sqrt(np.expm1(square))))

    def from_standard(self, t: npt.ArrayLike) -> Derivatives:
        """Return x = median factor**t with derivatives."""
        x = self.median * np.exp(self._ln_sd * as_array(t))
        return Derivatives(x, self._ln_sd * x, self._ln_sd**2 * x)

    def to_standard(self, x: npt.ArrayLike) -> Array:
        """Return t = ln(x/median)/ln factor."""
        with np.errstate(divide="ignore"):
            t: Array = np.log(np.maximum(as_array(x), 0.0) / self.median) / self._ln_sd
        return t

    def ln_density(self, x: npt.ArrayLike) -> Array:
        """Return the normal ln density of ln x, less ln x."""
        place = as_array(x)
        ln_place = np.log(np.where(place > 0.0, place, 1.0))
        t = (ln_place - np.log(self.median)) / self._ln_sd
        inner = -0.5 * t * t - LN_SQRT_TWO_PI - np.log(self._ln_sd) - ln_place
        return np.where(place > 0.0, inner, -np.inf)

    def fit_penalty(self, x: npt.ArrayLike) -> Derivatives:
        """Return -t^2/2 with t = ln(x/median)/ln factor."""
        place = np.maximum(as_array(x), TINY**0.25)
        t = np.log(place / self.median) / self._ln_sd
        slope = 1.0 / (self._ln_sd * place)
        return Derivatives(-0.5 * t * t, -t * slope, slope * (t / place - slope))

    def scaled(self, factor: float) -> Self | None:
        """Return the log-normal whose ln factor is scaled."""
        return replace(self, factor=self.factor**factor)

    def text(self) -> str:
        """Return the prior in words."""
        return f"log-normal with median {self.median:g}, times or over {self.factor:g}"
