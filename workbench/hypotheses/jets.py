"""Values with exact first and second derivatives.

A `Jet` holds a value, its gradient and its second derivatives with respect to a few variables. Arithmetic on
jets follows the rules of differentiation to second order, so that a shape written once as a formula has exact
derivatives and nothing is differenced numerically.

Jets of different numbers of axes combine as arrays do: batch axes are matched from the right. A jet without
variables is a constant beside one with variables.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import ClassVar, NamedTuple

import numpy as np
import numpy.typing as npt
from scipy import special

Array = npt.NDArray[np.float64]


class Derivatives(NamedTuple):
    """A function's value with its first and second derivative."""

    value: Array
    first: Array
    second: Array


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

    __array_ufunc__: ClassVar[None] = None  # array * jet is a jet, not an array of jets

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

    @property
    def moves(self) -> bool:
        """Tell whether any derivative differs from zero."""
        return bool(self.first.any() or self.second.any())

    @property
    def is_constant(self) -> bool:
        """Tell whether this is plainly a constant: no variables, or one zero derivative for all the batch.

        Unlike `moves` it never looks through large arrays.
        """
        m = self.variables
        return m == 0 or (self.first.size == m and self.second.size == m * m and not self.moves)

    def over_bins(self) -> Jet:
        """Return the same jet with a bin axis of length 1 at the end."""
        return Jet(self.value[..., None], self.first[..., None], self.second[..., None])

    def spread(self, *shape: int) -> Jet:
        """Return the same jet, value and derivatives broadcast to a shape (as views)."""
        jet, m = self.with_axes(len(shape)), self.variables
        return Jet(
            np.broadcast_to(jet.value, shape),
            np.broadcast_to(jet.first, (m, *shape)),
            np.broadcast_to(jet.second, (m, m, *shape)),
        )

    def apply(self, value: Array, slope: Array, bend: Array) -> Jet:
        """Return f of this jet, given f, f' and f'' at its value (chain rule)."""
        if self.is_constant:
            return Jet.constant(value, self.variables)
        jet = self.with_axes(np.ndim(value))
        outer = jet.first[:, None] * jet.first[None, :]
        return Jet(value, slope * jet.first, slope * jet.second + bend * outer)

    def with_axes(self, number: int) -> Jet:
        """Return the jet with axes of length 1 put before the batch, up to a number of axes."""
        missing = number - self.value.ndim
        if missing <= 0:
            return self
        ones, m, shape = (1,) * missing, self.variables, self.value.shape
        return Jet(
            self.value.reshape((*ones, *shape)),
            self.first.reshape((m, *ones, *self.first.shape[1:])),
            self.second.reshape((m, m, *ones, *self.second.shape[2:])),
        )

    def _scaled(self, factor: float | Array) -> Jet:
        jet = self.with_axes(np.ndim(factor))
        return Jet(jet.value * factor, jet.first * factor, jet.second * factor)

    def __add__(self, other: Jet | float | Array) -> Jet:
        if not isinstance(other, Jet):
            jet = self.with_axes(np.ndim(other))
            return Jet(jet.value + other, jet.first, jet.second)
        left, right = matched(self, other)
        return Jet(left.value + right.value, left.first + right.first, left.second + right.second)

    __radd__ = __add__

    def __neg__(self) -> Jet:
        return Jet(-self.value, -self.first, -self.second)

    def __sub__(self, other: Jet | float | Array) -> Jet:
        return self + (-other)

    def __rsub__(self, other: float | Array) -> Jet:
        return (-self) + other

    def __mul__(self, other: Jet | float | Array) -> Jet:
        if not isinstance(other, Jet):
            return self._scaled(other)
        left, right = matched(self, other)
        if right.is_constant:
            return left._scaled(right.value)
        if left.is_constant:
            return right._scaled(left.value)
        cross = left.first[:, None] * right.first[None, :]
        return Jet(
            left.value * right.value,
            left.first * right.value + right.first * left.value,
            left.second * right.value + right.second * left.value + cross + np.swapaxes(cross, 0, 1),
        )

    __rmul__ = __mul__

    def reciprocal(self) -> Jet:
        """Return 1/x."""
        inverse = 1.0 / self.value
        if self.is_constant:
            return Jet.constant(inverse, self.variables)
        return self.apply(inverse, -(inverse**2), 2.0 * inverse**3)

    def __truediv__(self, other: Jet | float | Array) -> Jet:
        return self * other.reciprocal() if isinstance(other, Jet) else self * (1.0 / other)

    def __rtruediv__(self, other: float | Array) -> Jet:
        return self.reciprocal() * other

    def exp(self) -> Jet:
        """Return e to the power of this jet."""
        value = np.exp(self.value)
        return self.apply(value, value, value)

    def expm1(self) -> Jet:
        """Return exp(x) - 1 without loss of digits near 0."""
        if self.is_constant:
            return Jet.constant(np.expm1(self.value), self.variables)
        value = np.exp(self.value)
        return self.apply(np.expm1(self.value), value, value)

    def log(self) -> Jet:
        """Return the natural logarithm."""
        if self.is_constant:
            return Jet.constant(np.log(self.value), self.variables)
        inverse = 1.0 / self.value
        return self.apply(np.log(self.value), inverse, -(inverse**2))

    def arctan(self) -> Jet:
        """Return the arc tangent."""
        if self.is_constant:
            return Jet.constant(np.arctan(self.value), self.variables)
        weight = 1.0 / (1.0 + self.value**2)
        return self.apply(np.arctan(self.value), weight, -2.0 * self.value * weight**2)

    def normal_cdf(self) -> Jet:
        """Return the standard normal distribution function."""
        if self.is_constant:
            return Jet.constant(special.ndtr(self.value), self.variables)
        density = np.exp(-0.5 * self.value**2) / np.sqrt(2.0 * np.pi)
        return self.apply(special.ndtr(self.value), density, -self.value * density)


def matched(left: Jet, right: Jet) -> tuple[Jet, Jet]:
    """Return two jets with as many batch axes and as many variables as each other.

    Args:
        left: a jet.
        right: another; as many variables, or one of the two has none.

    Returns:
        Both, ready to be combined number by number.

    Raises:
        ValueError: if both have variables, and not as many.
    """
    axes = max(left.value.ndim, right.value.ndim)
    m = max(left.variables, right.variables)
    pair = []
    for jet in (left, right):
        if jet.variables not in {0, m}:
            raise ValueError(f"a jet of {jet.variables} variables meets one of {m}")
        pair.append((jet if jet.variables == m else Jet.constant(jet.value, m)).with_axes(axes))
    return pair[0], pair[1]


def choose(condition: npt.NDArray[np.bool_], yes: Jet, no: Jet) -> Jet:
    """Return one jet where the condition holds and the other elsewhere."""
    left, right = matched(yes, no)
    left, right = left.with_axes(condition.ndim), right.with_axes(condition.ndim)
    if left.variables == 0:
        return Jet.constant(np.where(condition, left.value, right.value))
    return Jet(
        np.where(condition, left.value, right.value),
        np.where(condition, left.first, right.first),
        np.where(condition, left.second, right.second),
    )


def compose(
    value: Array,
    arguments: Sequence[Jet],
    slope: Callable[[int], Array],
    bend: Callable[[int, int], Array],
) -> Jet:
    """Return a function of several jets by bins, given its derivatives in those jets.

        df/dx_i       = sum_k f_k dA_k/dx_i
        d2f/dx_i dx_j = sum_k f_k d2A_k/dx_i dx_j + sum_kn f_kn dA_k/dx_i dA_n/dx_j

    Only the derivatives of arguments that move are asked for.

    Args:
        value: (..., bin) the function.
        arguments: jets (...) without bin axis, A_k.
        slope: k to (..., bin) f_k.
        bend: k, n with k <= n to (..., bin) f_kn.

    Returns:
        (..., bin) the function as a jet.

    Source:
        None, definition (chain rule).
    """
    m = max((argument.variables for argument in arguments), default=0)
    moving = [k for k, argument in enumerate(arguments) if argument.moves]
    if not moving:
        return Jet.constant(value, m)
    inner = {k: arguments[k].over_bins().with_axes(value.ndim) for k in moving}
    slopes = {k: slope(k) for k in moving}
    bends = {(k, n): bend(k, n) for k in moving for n in moving if k <= n}
    by_variable = [[k for k in moving if inner[k].first[i].any()] for i in range(m)]
    first = np.zeros((m, *value.shape))
    second = np.zeros((m, m, *value.shape))
    for i in range(m):
        for k in by_variable[i]:
            first[i] += slopes[k] * inner[k].first[i]
        for j in range(i, m):
            for k in moving:
                if inner[k].second[i, j].any():
                    second[i, j] += slopes[k] * inner[k].second[i, j]
            for k in by_variable[i]:
                for n in by_variable[j]:
                    outer = inner[k].first[i] * inner[n].first[j]
                    second[i, j] += bends[min(k, n), max(k, n)] * outer
            second[j, i] = second[i, j]
    return Jet(value, first, second)
