"""The normal prior, whole or cut off at one or both ends."""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from typing import ClassVar, Self

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.hypotheses.jets import Derivatives
from workbench.hypotheses.priors.family import (
    LN_SQRT_TWO_PI,
    Array,
    ContinuousPrior,
    Moments,
    as_array,
    ln_normal_mass,
    normal_density,
    numbers_faults,
    positive_fault,
    range_fault,
    refuse,
    standard_from_ln_tails,
)


@dataclass(frozen=True, slots=True)
class Normal(ContinuousPrior):
    """Normal; cut off below low and above high, and renormalised, where they are given.

    Attributes:
        mean: mean of the whole normal.
        sd: standard deviation of the whole normal; `moments` are those after the cut.
        low: lower end, or None.
        high: upper end, or None.
    """

    family: ClassVar[str] = "normal"
    mean: float = field()  # field() keeps the inherited property from being its default
    sd: float = field()
    low: float | None = None
    high: float | None = None

    def __post_init__(self) -> None:
        ends = {"low": self.low, "high": self.high}
        given = {name: value for name, value in ends.items() if value is not None}
        refuse(
            self.family,
            *numbers_faults(mean=self.mean, sd=self.sd, **given),
            positive_fault("sd", self.sd),
            range_fault(*self.support),
        )

    @property
    def support(self) -> tuple[float, float]:
        """Return the ends, infinite where not given."""
        low = -float("inf") if self.low is None else self.low
        return (low, float("inf") if self.high is None else self.high)

    @property
    def _is_whole(self) -> bool:
        return self.low is None and self.high is None

    @property
    def _ends(self) -> tuple[float, float]:
        """Return the ends in standard deviations from the mean."""
        low, high = self.support
        return ((low - self.mean) / self.sd, (high - self.mean) / self.sd)

    @property
    def moments(self) -> Moments:
        """Return mean and standard deviation after the cut.

        Source:
            Trapezium rule in the standard coordinate, which converges exponentially for smooth integrands.
        """
        if self._is_whole:
            return Moments(self.mean, self.sd)
        t = np.linspace(-12.0, 12.0, 961)
        weight = normal_density(t) * (t[1] - t[0])
        x = self.from_standard(t).value
        centre = float(np.sum(weight * x))
        return Moments(centre, float(np.sqrt(np.sum(weight * (x - centre) ** 2))))

    def from_standard(self, t: npt.ArrayLike) -> Derivatives:
        """Return x = mean + sd t, or its truncated counterpart, with derivatives."""
        t = as_array(t)
        if self._is_whole:
            zero = np.zeros(t.shape)
            return Derivatives(self.mean + self.sd * t, zero + self.sd, zero)
        low, high = self._ends
        ln_mass = ln_normal_mass(low, high)
        ln_below = np.logaddexp(special.log_ndtr(low), ln_mass + special.log_ndtr(t))
        ln_above = np.logaddexp(special.log_ndtr(-high), ln_mass + special.log_ndtr(-t))
        # Rounding in ln_above or ln_below may pass the end by one unit in the last place.
        u = np.clip(standard_from_ln_tails(ln_below, ln_above), low, high)
        slope = np.exp(ln_mass + 0.5 * (u - t) * (u + t))
        x = np.clip(self.mean + self.sd * u, *self.support)
        return Derivatives(x, self.sd * slope, self.sd * slope * (u * slope - t))

    def to_standard(self, x: npt.ArrayLike) -> Array:
        """Return t of x."""
        u = (as_array(x) - self.mean) / self.sd
        if self._is_whole:
            return u
        low, high = self._ends
        u = np.clip(u, low, high)
        ln_mass = ln_normal_mass(low, high)
        below, above = ln_normal_mass(low, u) - ln_mass, ln_normal_mass(u, high) - ln_mass
        return standard_from_ln_tails(np.minimum(below, 0.0), np.minimum(above, 0.0))

    def ln_density(self, x: npt.ArrayLike) -> Array:
        """Return the ln density, renormalised over what the ends leave."""
        place = as_array(x)
        low, high = self.support
        inner = -0.5 * ((place - self.mean) / self.sd) ** 2 - LN_SQRT_TWO_PI - np.log(self.sd)
        if not self._is_whole:
            inner = inner - ln_normal_mass(*self._ends)
        return np.where((place >= low) & (place <= high), inner, -np.inf)

    def fit_penalty(self, x: npt.ArrayLike) -> Derivatives:
        """Return -((x - mean)/sd)^2/2."""
        u = (as_array(x) - self.mean) / self.sd
        return Derivatives(-0.5 * u * u, -u / self.sd, np.zeros(u.shape) - self.sd**-2)

    def scaled(self, factor: float) -> Self | None:
        """Return the normal with its sd scaled, mean and ends kept."""
        return replace(self, sd=factor * self.sd)

    def text(self) -> str:
        """Return the prior in words."""
        ends = "" if self.low is None else f" from {self.low:g}"
        ends += "" if self.high is None else f" to {self.high:g}"
        return f"normal {self.mean:g} ± {self.sd:g}{ends}"
