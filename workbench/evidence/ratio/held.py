"""The marginal likelihood with the signal parameters held: nuisance coordinates integrated at many points.

At each point they are brought to their maximum and drawn from around it. The same draws serve all points, so
that what a few draws miss is nearly the same everywhere and leaves the ratio of two points alone.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.evidence.integral.bending import following
from workbench.evidence.integral.lattice import shifted_lattices
from workbench.evidence.integral.matrices import upper_roots
from workbench.evidence.integral.nodes import Integrand, laplace
from workbench.evidence.integral.quadrature import Grid
from workbench.evidence.integral.search import Landscape, signal_events, survey
from workbench.evidence.integral.stretching import stretch_for
from workbench.hypotheses.priors import Uniform
from workbench.likelihood.model import Model
from workbench.likelihood.objective import values_at_once

Array = npt.NDArray[np.float64]
Flags = npt.NDArray[np.bool_]
Indices = npt.NDArray[np.intp]

SCRAMBLES = 16
FEWEST_DRAWS = 8  # in a scramble; each with its mirror image
MANY_DRAWS = 64
_LATTICE_FROM = MANY_DRAWS
_FARTHEST = 37.0
_LEAST_SHARE = 1e-6  # of the signal's events, as background in a bin that has next to none
FAILED = -1e300  # ln marginal likelihood of a point without a maximum to integrate around


@dataclass(frozen=True, slots=True, eq=False)
class Held:
    """ln marginal likelihoods with the signal parameters held.

    Attributes:
        ln_laplace: (point,) by Laplace's method [nats].
        corrections: (point, scramble) what independent sets of draws multiply it by.
        modes: (point, coordinate) standard coordinates of the maximum.
        converged: (point,) True where the maximum was found.
    """

    ln_laplace: Array
    corrections: Array
    modes: Array
    converged: Flags

    def take(self, rows: Indices) -> Held:
        """Return some points."""
        return Held(self.ln_laplace[rows], self.corrections[rows], self.modes[rows], self.converged[rows])

    def joined(self, other: Held) -> Held:
        """Return these points and others."""
        return Held(
            np.concatenate([self.ln_laplace, other.ln_laplace]),
            np.concatenate([self.corrections, other.corrections]),
            np.concatenate([self.modes, other.modes]),
            np.concatenate([self.converged, other.converged]),
        )

    @property
    def ln_evidence(self) -> Array:
        """Return (point,) ln marginal likelihoods [nats]."""
        with np.errstate(divide="ignore"):
            return np.asarray(self.ln_laplace + np.log(self.corrections.mean(axis=1)))

    def ln_ratio(self, reference: Held) -> tuple[Array, Array]:
        """Return (point,) ln of the ratio to one reference point, and its error.

        The error is the spread over scrambles of the ratio of both corrections: they share their draws.
        """
        relative = self.corrections / reference.corrections
        spread = relative.std(axis=1, ddof=1) / np.sqrt(SCRAMBLES)
        error = spread / np.maximum(relative.mean(axis=1), 1e-300)
        return self.ln_evidence - reference.ln_evidence[0], error


@dataclass(frozen=True, slots=True, eq=False)
class Draws:
    """Draws of the nuisance coordinates around their maximum, the same for all points.

    Attributes:
        whitened: (draw, nuisance) offsets in units of standard deviations, scramble after scramble, bent as
            the integrand is where R is largest.
        ln_density: (draw,) ln of their density, less that of the Gaussian's top [nats].
        turn: (nuisance, nuisance) from directions of the Hessian's root to those of the bend.
    """

    whitened: Array
    ln_density: Array
    turn: Array


@dataclass(frozen=True, slots=True, eq=False)
class Response:
    """What the linear response of the counts says of a strength, column by column.

    Attributes:
        best: (column,) best strength.
        events: (column,) signal events at strength 1 [events].
        worth: (column,) strength that adds about as many events as the background has where the signal is.
        absorbed: (column, nuisance) what a unit of strength replaces.
    """

    best: Array
    events: Array
    worth: Array
    absorbed: Array


@dataclass(frozen=True, eq=False)
class Holder:
    """A hypothesis whose signal parameters can be held anywhere in their ranges, whatever their priors.

    Attributes:
        model: the hypothesis, its signal priors replaced by flat ones over the ranges.
        counts: (bin,) observed counts [events].
        landscape: the background's mode.
        draws: of the nuisance coordinates, which serve every point.
    """

    model: Model
    counts: Array
    landscape: Landscape
    draws: Draws

    @cached_property
    def integrand(self) -> Integrand:
        """Return the engine's integrand, whose maxima and Laplace's method are used."""
        return Integrand(self.model, self.counts, self.landscape)

    def standard(self, values: Array) -> Array:
        """Return (point, signal) standard coordinates of (point, signal) parameter values."""
        priors = [self.model.coordinates[index].prior for index in self.model.signal]
        found = [prior.to_standard(values[:, place]) for place, prior in enumerate(priors)]
        return np.asarray(np.clip(np.stack(found, axis=1), -_FARTHEST, _FARTHEST))

    def response(self, outer: Array, strength: float) -> Response:
        """Return what the linear response of the counts says of the last strength.

        Args:
            outer: (column, outer) values of the other signal parameters.
            strength: a strength at which the signal is not 0.
        """
        values = np.concatenate([outer, np.full((len(outer), 1), strength)], axis=1)
        events = signal_events(self.model, self.landscape, self.standard(values)) / strength
        best, information = self.landscape.amplitudes(events)
        total = np.maximum(events.sum(axis=1), 1e-300)
        background = np.maximum(self.landscape.expected, _LEAST_SHARE * total[:, None])
        worth = total / np.maximum((events**2 / background).sum(axis=1), 1e-300)
        return Response(best, total, np.minimum(worth, total / information), self.landscape.absorbed(events))

    @np.errstate(all="ignore")
    def at(self, values: Array, absorbed: Array, is_worth: Callable[[Array], Flags]) -> Held:
        """Return ln marginal likelihoods.

        Args:
            values: (point, signal) parameter values, in the order of the model's signal coordinates.
            absorbed: (point, nuisance) how far the signal moves the nuisance coordinates from where the
                background alone has them.
            is_worth: (point,) ln marginal likelihoods by Laplace's method to where draws shall correct them.
        """
        integrand = self.integrand
        starts = np.repeat(self.landscape.base[None], len(values), axis=0)
        starts[:, self.model.signal] = self.standard(values)
        starts[:, integrand.nuisance] -= absorbed
        found = integrand.climb(starts, integrand.nuisance)
        signal = found.points[:, self.model.signal]
        taken_out = 0.5 * (signal**2).sum(axis=1) + 0.5 * signal.shape[1] * np.log(2.0 * np.pi)
        hessians = found.hessians[:, integrand.nuisance[:, None], integrand.nuisance[None, :]]
        tops = found.values + found.gains
        ln_laplace = tops + taken_out + laplace(hessians)
        ln_laplace = np.where(np.isfinite(ln_laplace), ln_laplace, FAILED)
        corrections = np.ones((len(values), SCRAMBLES))
        rows = np.flatnonzero(is_worth(ln_laplace) & _has_maximum(hessians))
        if integrand.nuisance.size and rows.size:
            corrections[rows] = self._corrections(found.points[rows], tops[rows], hessians[rows])
        return Held(ln_laplace, corrections, found.points, found.converged)

    def _corrections(self, modes: Array, tops: Array, hessians: Array) -> Array:
        """Return (point, scramble) means of the integrand over what Laplace's method takes it for."""
        nuisance, draws = self.integrand.nuisance, self.draws
        outward = np.linalg.inv(draws.turn @ upper_roots(-hessians))
        each = max(1, values_at_once(self.model) // len(draws.whitened))
        objective = self.integrand.objective
        found = np.zeros((len(modes), SCRAMBLES))
        for first in range(0, len(modes), each):
            rows = slice(first, first + each)
            points = np.repeat(modes[rows, None, :], len(draws.whitened), axis=1)
            points[:, :, nuisance] += draws.whitened @ np.swapaxes(outward[rows], 1, 2)
            values = objective.value(points.reshape(-1, modes.shape[1]), self.counts)
            ln_weights = values.reshape(len(points), -1) - tops[rows, None] - draws.ln_density
            weights = np.exp(np.nan_to_num(ln_weights, nan=-np.inf))
            found[rows] = weights.reshape(len(points), SCRAMBLES, -1).mean(axis=2)
        return found


def drawn(grid: Grid, number: int, seed: np.random.SeedSequence) -> Draws:
    """Return draws for all points.

    Args:
        grid: the engine's quadrature of the hypothesis, whose bend is followed.
        number: how many in each of the 16 independent scrambles, each with its mirror image; a power of 2.
        seed: where they come from.
    """
    size = grid.integrand.nuisance.size
    spread = size if number >= _LATTICE_FROM else 0  # a small lattice ties dimensions to each other
    cubes = shifted_lattices(number, spread, SCRAMBLES, np.random.default_rng(seed), size - spread)
    normal = special.ndtri(np.concatenate([cubes, 1.0 - cubes], axis=1).reshape(2 * number * SCRAMBLES, size))
    stretch = stretch_for(size)
    stretched = stretch.forward(normal)
    ln_density = stretch.ln_density(stretched) + 0.5 * size * np.log(2.0 * np.pi)
    bend = grid.bending
    if bend is None:
        return Draws(stretched, ln_density, np.eye(size))
    path = following(bend.third, bend.ridge)
    whitened = path.forward(stretched)
    best = np.unravel_index(int(np.argmax(grid.columns.ln_height)), grid.columns.ln_height.shape)
    root = upper_roots(-grid.columns.hessians[best][None])[0]
    turn = np.linalg.solve(root.T, bend.axes.T).T
    return Draws(whitened, ln_density - path.inverse(whitened)[1], turn)


def _has_maximum(hessians: Array) -> Flags:
    """Return (point,) True where the Hessian is that of a maximum."""
    finite = np.asarray(np.isfinite(hessians).all(axis=(1, 2)))
    least = np.linalg.eigvalsh(np.where(finite[:, None, None], -hessians, 0.0)).min(axis=1, initial=np.inf)
    return np.asarray(finite & (least > 0.0))


def holder(model: Model, counts: Array, ranges: list[tuple[float, float]], draws: Draws) -> Holder:
    """Return a hypothesis whose signal parameters can be held anywhere in their ranges.

    Args:
        model: a hypothesis with signal parameters.
        counts: (bin,) observed counts [events].
        ranges: ends for each signal coordinate, in the model's order.
        draws: of its nuisance coordinates.
    """
    coordinates = list(model.coordinates)
    for index, (low, high) in zip(model.signal, ranges, strict=True):
        coordinates[index] = replace(coordinates[index], prior=Uniform(low, high))
    opened = replace(model, coordinates=tuple(coordinates))
    return Holder(opened, counts, survey(opened, counts, {}), draws)
