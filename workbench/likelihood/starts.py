"""Starting points of a fit: every place in the signal coordinates where the counts ask for something."""

from __future__ import annotations

from contextlib import suppress
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from workbench.likelihood.coordinates import Coordinate
from workbench.likelihood.model import Model
from workbench.likelihood.newton import maximise
from workbench.likelihood.objective import FitObjective, fit_objective

Array = npt.NDArray[np.float64]
Indices = npt.NDArray[np.intp]
Flags = npt.NDArray[np.bool_]

_GRID = 240
# Climbs a row: of a few thousand rows of noise some need the fourth.
_CLIMBS = 4
# A candidate promised this much less than the best one is not climbed [nats].
_BEHIND = 3.0
# With fewer candidates than this, a strength at its prior's median is tried as well.
_FEW = 10
_SMALLEST_SHARE = 0.05
# The background's fit only shows where to start [nats].
_ROUGHLY = 0.01


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

    def starts(self, counts: Array, climbs: int = _CLIMBS) -> tuple[Array, Indices]:
        """Return starting points for each row of counts.

        The background is fitted to each row; the gain of every candidate is then judged by the linear
        response of the residuals, what nuisance parameters can absorb taken out. The best candidates that
        differ from one another are climbed, those that promise far less than the best left out.

        Args:
            counts: (batch, bin) counts [events].
            climbs: starting points a row at the most, among candidates over a signal's shape.

        Returns:
            (start, coordinate) points and the (start,) row that each belongs to.
        """
        model = self.objective.model
        rows = np.arange(len(counts))
        centres = np.repeat(self.centre[None], len(counts), axis=0)
        if model.signal.size == 0:
            return centres, rows
        fitted = maximise(
            self.background, centres, counts, moving=self._nuisance(), tolerance=_ROUGHLY, scale=self.scale
        ).points
        amplitude, gain = self._gains(counts, fitted)
        chosen, is_worth = _spread_out(gain, self._similar(), climbs)
        owners, slots = np.nonzero(is_worth)
        pick = chosen[owners, slots]
        points = fitted[owners]
        points[:, model.signal] = self.grid[pick][:, model.signal]
        strengths = np.array([c.is_strength for c in model.coordinates])
        scaled = self.grid[pick] * np.maximum(amplitude[owners, pick], _SMALLEST_SHARE)[:, None]
        points[:, strengths] = scaled[:, strengths]
        if len(self.grid) < _FEW:
            points, owners = np.concatenate([fitted, points]), np.concatenate([rows, owners])
        return np.clip(points, self.objective.low, self.objective.high), owners

    def _nuisance(self) -> Flags:
        """Return (coordinate,) True for what is no signal parameter."""
        return ~np.isin(np.arange(self.objective.model.size), self.objective.model.signal)

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
        with suppress(np.linalg.LinAlgError):  # where double precision fails, nothing is taken to be absorbed
            projected = projected - (projected @ response) @ np.linalg.solve(stiffness, weighted.T)
        information = np.maximum(np.einsum("si,si->s", projected, self.events), 1e-300)
        amplitude = ((counts - expected) @ projected.T) / information
        positive = np.maximum(amplitude, 0.0)
        return amplitude, 0.5 * positive**2 * information

    def _similar(self) -> Flags:
        """Return (start, start) True where two candidates are the same signal to the counts."""
        size = np.maximum(np.linalg.norm(self.events, axis=1), 1e-300)
        unit = self.events / size[:, None]
        return np.asarray(unit @ unit.T > 0.7)


def _spread_out(gain: Array, similar: Flags, climbs: int) -> tuple[Indices, Flags]:
    """Return (row, slot) candidates, best first and unlike one another, and which are worth a climb."""
    rows = np.arange(len(gain))
    left = gain.copy()
    chosen = np.zeros((len(gain), climbs), dtype=np.intp)
    promised = np.zeros(chosen.shape)
    for slot in range(climbs):
        chosen[:, slot] = np.argmax(left, axis=1)
        promised[:, slot] = left[rows, chosen[:, slot]]
        left[similar[chosen[:, slot]]] = -np.inf
    is_worth = promised > np.maximum(promised[:, :1] - _BEHIND, 0.0)
    is_worth[:, 0] = True
    return chosen, is_worth


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
    scale = np.array([_length(c) for c in model.coordinates], dtype=float)
    grid = _candidates(model, centre)
    events = only.expected(only.natural_seeds(grid))[0] if model.signal.size else np.zeros((0, model.bins))
    return Searcher(fit_objective(model), fit_objective(background), centre, scale, grid, events)


def _centre(coordinate: Coordinate) -> float:
    return 0.0 if coordinate.role == "source" else float(coordinate.prior.median)


def _length(coordinate: Coordinate) -> float:
    """Return the prior's sd, or where double precision gives none above 0 a length of the median's size."""
    sd = 1.0 if coordinate.role == "source" else float(coordinate.prior.sd)
    return sd if 0.0 < sd < np.inf else abs(_centre(coordinate)) or 1.0


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
    search: Searcher, counts: Array, tolerance: float = 1e-7, climbs: int = _CLIMBS
) -> tuple[Array, Array, Flags]:
    """Return the best fit of each row of counts.

    Args:
        search: the hypothesis' searcher.
        counts: (batch, bin) counts [events].
        tolerance: expected further gain at which a fit is final [nats].
        climbs: starting points a row at the most.

    Returns:
        (batch, coordinate) best points, (batch,) penalised ln likelihood and (batch,) whether it converged.
    """
    starts, owners = search.starts(counts, climbs)
    found = maximise(search.objective, starts, counts[owners], scale=search.scale, tolerance=tolerance)
    values = np.where(np.isfinite(found.values), found.values, -np.inf)
    order = np.lexsort((-values, owners))
    best = order[np.searchsorted(owners[order], np.arange(len(counts)))]
    return found.points[best], values[best], found.converged[best]
