"""What is maximised: the log likelihood with priors or penalties, in standard or natural coordinates."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol

import numpy as np
import numpy.typing as npt

from workbench.hypotheses.quantities import parameters_of
from workbench.hypotheses.shapes.family import AnalyticShape
from workbench.likelihood.gradients import gradient
from workbench.likelihood.model import Model

Array = npt.NDArray[np.float64]

_CHUNK = 1_200_000  # numbers at once where derivatives are made
_VALUES = 400_000  # and where they are not: arrays that fit a core's cache
_SHORT_OF_AN_END = 1e-6  # in prior standard deviations


class Objective(Protocol):
    """A function of (batch, coordinate) points with exact derivatives and a box of allowed points."""

    @property
    def low(self) -> Array:
        """Return (coordinate,) lower ends of the allowed box."""
        ...

    @property
    def high(self) -> Array:
        """Return (coordinate,) upper ends of the allowed box."""
        ...

    def value(self, points: Array, counts: Array) -> Array:
        """Return (batch,) values [nats]."""
        ...

    def derivatives(self, points: Array, counts: Array) -> tuple[Array, Array, Array]:
        """Return values, (batch, coordinate) gradients and (batch, coordinate, coordinate) Hessians."""
        ...


@dataclass(frozen=True, slots=True, eq=False)
class StandardObjective:
    """ln likelihood + ln standard-normal density of every coordinate: the integrand of the evidence.

    With t the standard-normal coordinates, x = F^-1(Phi(t)):
        ln p(n | x(t)) - t.t/2 - (d/2) ln 2 pi

    Attributes:
        model: a hypothesis.
        still: parameters whose derivatives nobody asks for; the likelihood's come out as 0 there.
    """

    model: Model
    still: frozenset[int] = frozenset()

    @property
    def low(self) -> Array:
        """Return the lower ends: none but where the normal tail underflows."""
        return np.full(self.model.size, -37.0)

    @property
    def high(self) -> Array:
        """Return the upper ends."""
        return np.full(self.model.size, 37.0)

    def value(self, points: Array, counts: Array) -> Array:
        """Return (batch,) ln integrand [nats] at (batch, coordinate) points."""
        likelihood = self.model.ln_likelihood(self.model.seeds(points), counts)
        return likelihood - _half_square(points)

    def derivatives(self, points: Array, counts: Array) -> tuple[Array, Array, Array]:
        """Return the ln integrand with exact gradient and Hessian."""
        value, gradient, hessian = self.model.derivatives(self.model.seeds(points, self.still), counts)
        diagonal = np.arange(self.model.size)
        hessian[:, diagonal, diagonal] -= 1.0
        return value - _half_square(points), gradient - points, hessian

    def gradient(self, points: Array, counts: Array) -> Array:
        """Return the (batch, coordinate) gradient of the ln integrand."""
        rows = rows_at_once(self.model) if self.model.has_template_errors else values_at_once(self.model)
        found = [
            gradient(self.model, self.model.seeds(points[first : first + rows], self.still), counts)
            for first in range(0, len(points), rows)
        ]
        return np.concatenate(found) - points


def _half_square(points: Array) -> Array:
    squares = np.einsum("na,na->n", points, points)
    return np.asarray(0.5 * squares + 0.5 * points.shape[1] * np.log(2.0 * np.pi))


@dataclass(frozen=True, slots=True, eq=False)
class FitObjective:
    """ln likelihood with the penalties of a fit, in the parameters themselves.

    A source adds -z^2/2; a nuisance parameter its ln prior density (in ln x for lognormal and loguniform),
    constant dropped; a signal parameter nothing, only its prior's range.
    """

    model: Model
    low: Array
    high: Array

    def value(self, points: Array, counts: Array) -> Array:
        """Return (batch,) penalised ln likelihood [nats] at (batch, coordinate) points."""
        return self.model.ln_likelihood(self.model.natural_seeds(points), counts) + self.penalty(points)[0]

    def derivatives(self, points: Array, counts: Array) -> tuple[Array, Array, Array]:
        """Return the penalised ln likelihood with exact gradient and Hessian."""
        value, gradient, hessian = self.model.derivatives(self.model.natural_seeds(points), counts)
        penalty, slope, bend = self.penalty(points)
        diagonal = np.arange(self.model.size)
        hessian[:, diagonal, diagonal] += bend
        return value + penalty, gradient + slope, hessian

    def penalty(self, points: Array) -> tuple[Array, Array, Array]:
        """Return (batch,) penalties with (batch, coordinate) first and second derivatives."""
        total = np.zeros(points.shape[0])
        slope, bend = np.zeros_like(points), np.zeros_like(points)
        for index, coordinate in enumerate(self.model.coordinates):
            if coordinate.role == "source":
                z = points[:, index]
                total -= 0.5 * z * z
                slope[:, index], bend[:, index] = -z, -1.0
            elif coordinate.role == "nuisance":
                value, first, second = coordinate.prior.fit_penalty(points[:, index])
                total += value
                slope[:, index], bend[:, index] = first, second
        return total, slope, bend


def fit_objective(model: Model) -> FitObjective:
    """Return what a fit of this hypothesis maximises, with every parameter's allowed range.

    Args:
        model: a hypothesis.

    Returns:
        The objective. Its range stops short of ends where a shape ceases to be one, such as a width of 0.
    """
    open_ended = _open_ended(model)
    low, high = np.full(model.size, -np.inf), np.full(model.size, np.inf)
    for index, coordinate in enumerate(model.coordinates):
        if coordinate.role != "source":
            low[index], high[index] = coordinate.prior.support
        if coordinate.name in open_ended:
            low[index] += _SHORT_OF_AN_END * coordinate.prior.sd
    return FitObjective(model, low, high)


def _open_ended(model: Model) -> set[str]:
    """Return the parameters that stand for a number of a shape which must be above a bound, not at it."""
    names: set[str] = set()
    for process in model.analysis.processes_of(model.hypothesis):
        for contribution in process.regions.values():
            shape = contribution.shape
            if isinstance(shape, AnalyticShape):
                for field, (_, is_strict) in shape.lower_bounds.items():
                    if is_strict and field in shape.quantities:
                        names.update(parameters_of(shape.quantities[field]))
    return names


def rows_at_once(model: Model) -> int:
    """Return how many points to evaluate together, so that memory stays bounded."""
    return max(1, _CHUNK // max(1, model.bins * (model.size + 2)))


def values_at_once(model: Model) -> int:
    """Return how many points to evaluate together where no derivatives are made."""
    return max(1, _VALUES // max(1, model.bins))
