"""What every prior family can do, and the normal tails they are built on.

A parameter x with distribution function F has the standard coordinate t with F(x) = Phi(t), Phi the standard
normal distribution function. All families are exact in both tails: upper tails go through 1 - F.
"""

from __future__ import annotations

from abc import ABC, abstractmethod
from typing import ClassVar, NamedTuple, Self

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.counts.magnitudes import WORKABLE, is_workable
from workbench.errors import InputError, Problem
from workbench.hypotheses.jets import Derivatives

Array = npt.NDArray[np.float64]
FARTHEST = 38.0  # a standard normal is never farther from 0 in double precision
TINY = float(np.finfo(float).tiny)
TAIL_KNOWN = 37.4  # Phi(-37.4) is still a normal double; scipy's inverses fail on subnormal ones
SERIES_BELOW = -58.0  # ln 1e-25: below it the first term of a power series is all there is
ROOT_TWO = float(np.sqrt(2.0))
LN_SQRT_TWO_PI = 0.5 * float(np.log(2.0 * np.pi))


class Moments(NamedTuple):
    """A mean and a standard deviation."""

    mean: float
    sd: float


class ContinuousPrior(ABC):
    """A proper prior with a density."""

    __slots__ = ()
    family: ClassVar[str]

    @property
    @abstractmethod
    def support(self) -> tuple[float, float]:
        """Return the smallest and the largest value, perhaps infinite."""

    @property
    @abstractmethod
    def moments(self) -> Moments:
        """Return the prior's own mean and standard deviation, truncation included."""

    @property
    def mean(self) -> float:
        """Return the expectation; where a field has this name (a truncated normal's), the field."""
        return self.moments.mean

    @property
    def sd(self) -> float:
        """Return the standard deviation; where a field has this name (a half-normal's), the field."""
        return self.moments.sd

    @property
    def median(self) -> float:
        """Return the value that half of the prior lies below."""
        return float(self.from_standard(0.0).value)

    @property
    def is_flat(self) -> bool:
        """Tell whether a fit sees this prior as a range and nothing else."""
        return False

    @abstractmethod
    def from_standard(self, t: npt.ArrayLike) -> Derivatives:
        """Return the parameter at a standard coordinate.

            F(x) = Phi(t),   dx/dt = phi(t)/f(x),   d2x/dt2 = dx/dt (-t - dx/dt (ln f)'(x))

        Args:
            t: (...) standard normal coordinate; within about [-38, 38].

        Returns:
            (...) x, dx/dt and d2x/dt2; finite, x inside the support.

        Source:
            None, definition (inverse of the distribution function).
        """

    @abstractmethod
    def to_standard(self, x: npt.ArrayLike) -> Array:
        """Return the standard coordinate of a parameter value; infinite outside the support.

        Args:
            x: (...) parameter values.

        Returns:
            (...) t with Phi(t) = F(x).

        Source:
            None, definition.
        """

    @abstractmethod
    def ln_density(self, x: npt.ArrayLike) -> Array:
        """Return the ln of the normalised density; minus infinity outside the support.

        Args:
            x: (...) parameter values.

        Returns:
            (...) ln f(x) [nats].

        Source:
            The family's textbook density.
        """

    @abstractmethod
    def fit_penalty(self, x: npt.ArrayLike) -> Derivatives:
        """Return what a fit adds to the ln likelihood for this prior.

        It is the ln density in x (in ln x for lognormal and loguniform) less a constant, so that it is 0 at
        its largest where it has a largest, and 0 throughout where it is flat.

        Args:
            x: (...) parameter values inside the support.

        Returns:
            (...) the penalty and its derivatives with respect to x [nats].

        Source:
            None, definition.
        """

    @abstractmethod
    def text(self) -> str:
        """Return the prior in words, for screens."""

    def scaled(self, factor: float) -> Self | None:  # noqa: ARG002
        """Return the prior with its width scaled; None where the family has no single width.

        Args:
            factor: what the width is multiplied by; > 0.

        Returns:
            The scaled prior, or None.
        """
        return None

    def quantile(self, p: npt.ArrayLike) -> Array:
        """Return the value below which the given part of the prior lies.

        Args:
            p: (...) probabilities; in [0, 1].

        Returns:
            (...) F^-1(p).

        Source:
            None, definition.
        """
        part = np.asarray(p, dtype=float)
        inside = np.clip(special.ndtri(np.clip(part, 0.0, 1.0)), -FARTHEST, FARTHEST)
        low, high = self.support
        ends = np.where(part <= 0.0, low, high)
        return np.where((part > 0.0) & (part < 1.0), self.from_standard(inside).value, ends)


def as_array(number: npt.ArrayLike) -> Array:
    """Return a number or numbers as an array of floats."""
    return np.asarray(number, dtype=float)


def normal_density(t: Array) -> Array:
    """Return the standard normal density."""
    density: Array = np.exp(-0.5 * t * t - LN_SQRT_TWO_PI)
    return density


def standard_from_tails(below: Array, above: Array) -> Array:
    """Return t from the probabilities below and above it, using the smaller of the two."""
    smaller = np.clip(np.minimum(below, above), 0.0, 0.5)
    t: Array = special.ndtri(smaller)
    return np.where(below <= above, t, -t)


def standard_from_ln_tails(below: Array, above: Array) -> Array:
    """Return t from the ln probabilities below and above it, using the smaller of the two."""
    t: Array = special.ndtri_exp(np.minimum(below, above))
    return np.where(below <= above, t, -t)


def ln_normal_mass(low: npt.ArrayLike, high: npt.ArrayLike) -> Array:
    """Return ln(Phi(high) - Phi(low)) without cancellation in the tails.

    Args:
        low: (...) lower limits in standard deviations; may be -inf.
        high: (...) upper limits, not below the lower; may be inf.

    Returns:
        (...) ln of the normal probability between them; -inf where they are equal.

    Source:
        None, definition: an interval above 0 is mirrored below it, where both tails are small; one across 0
        is a sum of two parts.
    """
    mirrored = as_array(low) > 0.0
    near = np.where(mirrored, -as_array(low), high)
    far = np.where(mirrored, -as_array(high), low)
    ln_near = special.log_ndtr(near)
    with np.errstate(divide="ignore", invalid="ignore"):
        tails: Array = ln_near + np.log(-np.expm1(special.log_ndtr(far) - ln_near))
        across: Array = np.log(0.5 * (special.erf(near / ROOT_TWO) - special.erf(far / ROOT_TWO)))
    return np.where(near == far, -np.inf, np.where(near > 0.0, across, tails))


def refuse(family: str, *faults: tuple[bool, str, object, str, str]) -> None:
    """Raise every fault that holds as one InputError.

    Args:
        family: the prior's family, for the place.
        faults: (holds, what, found, expected, remedy) for each demand.

    Raises:
        InputError: if any holds.
    """
    problems = [
        Problem(what, f"{family} prior", str(found), expected, remedy)
        for holds, what, found, expected, remedy in faults
        if holds
    ]
    if problems:
        raise InputError(*problems)


def numbers_faults(**numbers: float) -> list[tuple[bool, str, object, str, str]]:
    """Return the faults of numbers that are not finite, or too large or too small to be worked with."""
    faults: list[tuple[bool, str, object, str, str]] = []
    for name, value in numbers.items():
        is_finite = bool(abs(value) < np.inf)
        what = f"The prior's {name} is not finite"
        faults.append((not is_finite, what, value, "a finite number", f"give {name}"))
        what = f"The prior's {name} is too large or too small to be worked with"
        remedy = f"write {name} nearer to what is expected, or use other units"
        faults.append((is_finite and not is_workable(value), what, value, WORKABLE, remedy))
    return faults


def positive_fault(name: str, value: float) -> tuple[bool, str, object, str, str]:
    """Return the fault of a number that has to be above zero."""
    return (not value > 0.0, f"The prior's {name} is not above 0", value, "a number above 0", f"raise {name}")


def range_fault(low: float, high: float) -> tuple[bool, str, object, str, str]:
    """Return the fault of a range without inside."""
    found = f"low = {low:g}, high = {high:g}"
    return (not low < high, "The prior's range is empty", found, "low below high", "exchange low and high")
