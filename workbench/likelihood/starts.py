"""Starting points of a fit: every place in the signal coordinates where the counts ask for something."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from workbench.likelihood.coordinates import Coordinate
from workbench.likelihood.model import Model
from workbench.likelihood.newton import maximise
from workbench.likelihood.objective import FitObjective, fit_objective

Array = npt.NDArray[np.float64]
Indices = npt.NDArray[np.intp]

_GRID = 240
_KEPT = 3


@dataclass(frozen=True, slots=True, eq=False)
class Searcher:
    """Finds starting points for batches of counts.

    Attributes:
        objective: what the fit maximises.
        background: the same with every signal process left out.
        centre: (coordinate,) central values of all parameters.
        scale: (coordinate,) a length for each coordinate.
        grid: (start, coordinate) candidate points over the signal coordinates, nuisance parameters at the
            centre.
        events: (start, bin) events that each candidate adds to the background.
    """

    objective: FitObjective
    background: FitObjective
    centre: Array
    scale: Array
    grid: Array
    events: Array

    def starts(self, counts: Array) -> tuple[Array, Indices]:
        """Return starting points for each row of counts.

        The background is fitted to each row; the gain of every candidate is then judged by the linear
        response of the residuals, what nuisance parameters can absorb taken out.

        Args:
            counts: (batch, bin) counts [events].

        Returns:
            (start, coordinate) points and the (start,) row that each belongs to.
        """
        model = self.objective.model
        fitted = maximise(
            self.background,
            np.repeat(self.centre[None], len(counts), axis=0),
            counts,
            scale=self.scale,
            most=25,
        )
        rows = np.arange(len(counts))
        plain = fitted.points.copy()
        if model.signal.size == 0:
            return plain, rows
        amplitude, gain = self._gains(counts, fitted.points)
        best = np.argsort(-gain, axis=1)[:, : 4 * _KEPT]
        chosen = _spread_out(best, self._similar(), _KEPT)
        points = [plain]
        owners = [rows]
        strengths = np.array([c.is_strength for c in model.coordinates])
        for slot in range(chosen.shape[1]):
            start = fitted.points.copy()
            pick = chosen[:, slot]
            start[:, model.signal] = self.grid[pick][:, model.signal]
            scaled = self.grid[pick] * np.maximum(amplitude[rows, pick], 0.05)[:, None]
            start[:, strengths] = scaled[:, strengths]
            points.append(np.clip(start, self.objective.low, self.objective.high))
            owners.append(rows)
        return np.concatenate(points), np.concatenate(owners)

    def _gains(self, counts: Array, points: Array) -> tuple[Array, Array]:
        """Return (row, start) best amplitudes and expected gains of the log likelihood."""
        model = self.background.model
        middle = points.mean(axis=0, keepdims=True)
        slope = model.responses(model.natural_seeds(middle))
        nuisance = np.setdiff1d(np.arange(model.size), model.signal)
        response = slope[0, nuisance].T * self.scale[nuisance]
        expected, variance = model.expected(model.natural_seeds(points))
        typical = np.maximum(
            expected.mean(axis=0) + (0.0 if variance is None else variance.mean(axis=0)), 0.5
        )
        weighted = response / typical[:, None]
        stiffness = response.T @ weighted + np.eye(nuisance.size)
        projected = self.events / typical
        projected = projected - (projected @ response) @ np.linalg.solve(stiffness, weighted.T)
        information = np.maximum(np.einsum("si,si->s", projected, self.events), 1e-300)
        amplitude = ((counts - expected) @ projected.T) / information
        positive = np.maximum(amplitude, 0.0)
        return amplitude, 0.5 * positive**2 * information

    def _similar(self) -> npt.NDArray[np.bool_]:
        """Return (start, start) True where two candidates are the same signal to the counts."""
        size = np.maximum(np.linalg.norm(self.events, axis=1), 1e-300)
        unit = self.events / size[:, None]
        return np.asarray(unit @ unit.T > 0.7)


def _spread_out(best: Indices, similar: npt.NDArray[np.bool_], kept: int) -> Indices:
    """Return (row, kept) candidates, each unlike the better ones where there are such."""
    chosen = np.repeat(best[:, :1], kept, axis=1)
    taken = similar[best[:, 0]]
    for slot in range(1, kept):
        fresh = ~np.take_along_axis(taken, best, 1)
        pick = np.argmax(fresh, axis=1)
        chosen[:, slot] = best[np.arange(len(best)), pick]
        taken |= similar[chosen[:, slot]]
    return chosen


def searcher(model: Model) -> Searcher:
    """Return what finds starting points for a hypothesis.

    Args:
        model: a hypothesis.

    Returns:
        The searcher, its candidates spread over the signal coordinates' priors.
    """
    background = model.restricted("background", spare=True)
    only = model.restricted("signal", spare=False)
    centre = np.array([_centre(c) for c in model.coordinates], dtype=float)
    scale = np.array([1.0 if c.role == "source" else c.prior.sd for c in model.coordinates], dtype=float)
    grid = _candidates(model, centre)
    events = only.expected(only.natural_seeds(grid))[0] if model.signal.size else np.zeros((0, model.bins))
    return Searcher(fit_objective(model), fit_objective(background), centre, scale, grid, events)


def _centre(coordinate: Coordinate) -> float:
    return 0.0 if coordinate.role == "source" else float(coordinate.prior.median)


def _candidates(model: Model, centre: Array) -> Array:
    """Return (start, coordinate) points: a grid over signal shapes, strengths at their medians."""
    shapes = [index for index in model.signal if not model.coordinates[index].is_strength]
    strengths = [index for index in model.signal if model.coordinates[index].is_strength]
    each = {0: 1, 1: _GRID, 2: 40, 3: 12}.get(len(shapes), 4)
    share = (np.arange(each) + 0.5) / each
    mesh = np.meshgrid(*[share] * len(shapes), indexing="ij") if shapes else [np.array([0.5])]
    points = np.repeat(centre[None], mesh[0].size, axis=0)
    for index, part in zip(shapes, mesh, strict=False):
        points[:, index] = model.coordinates[index].prior.quantile(part.ravel())
    if len(strengths) < 2:
        return points
    alone = []
    for index in strengths:
        others = [other for other in strengths if other != index]
        single = points.copy()
        single[:, others] = np.maximum(0.0, [model.coordinates[other].prior.support[0] for other in others])
        alone.append(single)
    return np.concatenate([points, *alone])


def best_points(
    search: Searcher, counts: Array, tolerance: float = 1e-7
) -> tuple[Array, Array, npt.NDArray[np.bool_]]:
    """Return the best fit of each row of counts.

    Args:
        search: the hypothesis' searcher.
        counts: (batch, bin) counts [events].
        tolerance: expected further gain at which a fit is final [nats].

    Returns:
        (batch, coordinate) best points, (batch,) penalised ln likelihood and (batch,) whether it converged.
    """
    starts, owners = search.starts(counts)
    found = maximise(search.objective, starts, counts[owners], scale=search.scale, tolerance=tolerance)
    values = np.where(np.isfinite(found.values), found.values, -np.inf)
    table = values.reshape(-1, len(counts))
    best = np.argmax(table, axis=0) * len(counts) + np.arange(len(counts))
    return found.points[best], values[best], found.converged[best]
