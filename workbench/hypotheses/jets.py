"""Values with exact first and second derivatives.

A `Jet` holds a value, its gradient and its second derivatives with respect to a few variables. Arithmetic on
jets follows the rules of differentiation to second order, so that a shape written once as a formula has exact
derivatives and nothing is differenced numerically.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy import special

Array = npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class Jet:
    """A value with its derivatives with respect to `m` variables.

    Attributes:
        value: (...) the value.
        first: (m, ...) first derivatives; broadcasts against the value.
        second: (m, m, ...) second derivatives; broadcasts against the value.
    """

    value: Array
    first: Array
    second: Array

    @classmethod
    def constant(cls, value: npt.ArrayLike, variables: int = 0) -> Jet:
        """Return a jet whose derivatives are all zero."""
        number = np.asarray(value, dtype=float)
        flat = (1,) * number.ndim
        return cls(number, np.zeros((variables, *flat)), np.zeros((variables, variables, *flat)))

    @classmethod
    def variable(cls, value: Array, first: Array, second: Array, slot: int, variables: int) -> Jet:
        """Return variable number `slot` of `variables`, itself a function with the given derivatives."""
        gradient = np.zeros((variables, *value.shape))
        curvature = np.zeros((variables, variables, *value.shape))
        gradient[slot] = first
        curvature[slot, slot] = second
        return cls(value, gradient, curvature)

    @property
    def variables(self) -> int:
        """Return the number of variables."""
        return int(self.first.shape[0])

    def over_bins(self) -> Jet:
        """Return the same jet with a bin axis of length 1 at the end."""
        return Jet(self.value[..., None], self.first[..., None], self.second[..., None])

    def apply(self, value: Array, slope: Array, bend: Array) -> Jet:
        """Return f of this jet, given f, f' and f'' at its value (chain rule)."""
        if self.variables == 0:
            return Jet(value, np.zeros((0, *value.shape)), np.zeros((0, 0, *value.shape)))
        outer = self.first[:, None] * self.first[None, :]
        return Jet(value, slope * self.first, slope * self.second + bend * outer)

    def __add__(self, other: Jet | float) -> Jet:
        if not isinstance(other, Jet):
            return Jet(self.value + other, self.first, self.second)
        return Jet(self.value + other.value, self.first + other.first, self.second + other.second)

    __radd__ = __add__

    def __neg__(self) -> Jet:
        return Jet(-self.value, -self.first, -self.second)

    def __sub__(self, other: Jet | float) -> Jet:
        return self + (-other)

    def __rsub__(self, other: float) -> Jet:
        return (-self) + other

    def __mul__(self, other: Jet | float | Array) -> Jet:
        if not isinstance(other, Jet):
            return Jet(self.value * other, self.first * other, self.second * other)
        value = self.value * other.value
        if self.variables == 0:
            return Jet(value, np.zeros((0, *value.shape)), np.zeros((0, 0, *value.shape)))
        cross = self.first[:, None] * other.first[None, :]
        return Jet(
            value,
            self.first * other.value + other.first * self.value,
            self.second * other.value
            + other.second * self.value
            + cross
            + np.swapaxes(cross, 0, 1),
        )

    __rmul__ = __mul__

    def reciprocal(self) -> Jet:
        """Return 1/x."""
        inverse = 1.0 / self.value
        return self.apply(inverse, -(inverse**2), 2.0 * inverse**3)

    def __truediv__(self, other: Jet | float | Array) -> Jet:
        return self * other.reciprocal() if isinstance(other, Jet) else self * (1.0 / other)

    def __rtruediv__(self, other: float) -> Jet:
        return self.reciprocal() * other

    def exp(self) -> Jet:
        """Return e to the power of this jet."""
        value = np.exp(self.value)
        return self.apply(value, value, value)

    def expm1(self) -> Jet:
        """Return exp(x) - 1 without loss of digits near 0."""
        value = np.exp(self.value)
        return self.apply(np.expm1(self.value), value, value)

    def log(self) -> Jet:
        """Return the natural logarithm."""
        inverse = 1.0 / self.value
        return self.apply(np.log(self.value), inverse, -(inverse**2))

    def arctan(self) -> Jet:
        """Return the arc tangent."""
        weight = 1.0 / (1.0 + self.value**2)
        return self.apply(np.arctan(self.value), weight, -2.0 * self.value * weight**2)

    def normal_cdf(self) -> Jet:
        """Return the standard normal distribution function."""
        density = np.exp(-0.5 * self.value**2) / np.sqrt(2.0 * np.pi)
        return self.apply(special.ndtr(self.value), density, -self.value * density)


def choose(condition: npt.NDArray[np.bool_], yes: Jet, no: Jet) -> Jet:
    """Return one jet where the condition holds and the other elsewhere."""
    return Jet(
        np.where(condition, yes.value, no.value),
        np.where(condition, yes.first, no.first),
        np.where(condition, yes.second, no.second),
    )
