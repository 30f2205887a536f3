"""The integrand at nodes: signal coordinates held, everything else at its maximum and integrated by Laplace.

Outer coordinates (masses, widths, all strengths but the last) stand on the axes' nodes in prior probability.
The last strength, the inner coordinate, has in each column its own evenly spaced nodes in its standard-normal
coordinate, over the range where the integrand lives.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
import numpy.typing as npt

from workbench.evidence.integral.outlook import DEEP, Outlook
from workbench.evidence.integral.search import Landscape, signal_events
from workbench.likelihood.model import Model
from workbench.likelihood.newton import Maxima, maximise
from workbench.likelihood.objective import StandardObjective, rows_at_once

Array = npt.NDArray[np.float64]
Indices = npt.NDArray[np.intp]

INNER_NODES = 15
LEAST_LN_HEIGHT = -1e300  # of a node without a maximum to integrate around
_FAR_DOWN = 60.0
_TOLERANCE = 1e-3  # nats that one more step promises
_MANY, _ROUGHER = 3000, 3e-2  # where there are thousands of nodes, each carries little
_ADJUSTMENTS = 8
_CRAWL = 30  # evaluations a node; three are usual
_MOST_BATCHES = 300


@dataclass(frozen=True, slots=True, eq=False)
class Columns:
    """Nodes of one hypothesis.

    Attributes:
        outer: (column, outer) standard coordinates of the outer signal coordinates.
        inner: (column, inner) standard coordinates of the inner one; (column, 1) zeros where there is none.
        ln_height: (column, inner) ln of the integrand with the nuisance coordinates integrated, the outer
            prior density taken out [nats].
        points: (column, inner, coordinate) where the nuisance coordinates' maximum is.
        hessians: (column, inner, nuisance, nuisance) Hessian of the ln integrand there.
        converged: (column, inner) True where the maximisation converged.
        has_inner: False when every signal coordinate is an outer one.
        evaluations: how often derivatives were worked out to find all this.
    """

    outer: Array
    inner: Array
    ln_height: Array
    points: Array
    hessians: Array
    converged: npt.NDArray[np.bool_]
    has_inner: bool
    evaluations: int = 0

    def ln_integral(self) -> Array:
        """Return (column,) ln of the integral over the inner coordinate."""
        if not self.has_inner:
            return self.ln_height[:, 0]
        top = self.ln_height.max(axis=1)
        heights = np.exp(self.ln_height - top[:, None])
        return np.asarray(top + np.log(heights.sum(axis=1) * (self.inner[:, 1] - self.inner[:, 0])))

    def inner_error(self) -> Array:
        """Return (column,) relative error of the inner integral.

        Halving the spacing squares the relative error of the trapezoidal rule for an analytic bell, so that
        the square of the difference to every second node is its size.
        """
        if not self.has_inner:
            return np.zeros(len(self.outer))
        heights = np.exp(self.ln_height - self.ln_height.max(axis=1, keepdims=True))
        coarse = 2.0 * heights[:, ::2].sum(axis=1) / heights.sum(axis=1) - 1.0
        return np.asarray(coarse**2 + np.maximum(heights[:, 0], heights[:, -1]))

    @property
    def is_cut(self) -> bool:
        """Tell whether the highest node stands at an end of its column, so that there is more beyond."""
        last = self.inner.shape[1] - 1
        return last > 0 and int(np.argmax(self.ln_height)) % (last + 1) in {0, last}

    def take(self, order: Indices) -> Columns:
        """Return some columns, in the given order."""
        return Columns(
            self.outer[order],
            self.inner[order],
            self.ln_height[order],
            self.points[order],
            self.hessians[order],
            self.converged[order],
            self.has_inner,
            self.evaluations,
        )

    def joined(self, other: Columns) -> Columns:
        """Return these columns and others."""
        return Columns(
            np.concatenate([self.outer, other.outer]),
            np.concatenate([self.inner, other.inner]),
            np.concatenate([self.ln_height, other.ln_height]),
            np.concatenate([self.points, other.points]),
            np.concatenate([self.hessians, other.hessians]),
            np.concatenate([self.converged, other.converged]),
            self.has_inner,
            self.evaluations + other.evaluations,
        )


@dataclass(frozen=True, eq=False)
class Integrand:
    """What is integrated: a model with its counts and the landscape that its starting points come from."""

    model: Model
    counts: Array
    landscape: Landscape

    @cached_property
    def inner(self) -> int | None:
        """Return the coordinate of the last strength, or None."""
        signal = self.model.signal
        if signal.size and self.model.coordinates[signal[-1]].is_strength:
            return int(signal[-1])
        return None

    @cached_property
    def outer(self) -> tuple[int, ...]:
        """Return the other signal coordinates."""
        return tuple(int(index) for index in self.model.signal if index != self.inner)

    @cached_property
    def nuisance(self) -> Indices:
        """Return the coordinates that are integrated by Laplace."""
        return np.setdiff1d(np.arange(self.model.size), self.model.signal)

    @cached_property
    def objective(self) -> StandardObjective:
        """Return the ln integrand, without derivatives in the signal parameters."""
        return StandardObjective(self.model, frozenset(int(index) for index in self.model.signal))

    def columns(self, outer: Array) -> Columns:
        """Return the nodes at the given outer coordinates.

        Args:
            outer: (column, outer) standard-normal coordinates.

        Returns:
            The columns, each with its inner nodes.
        """
        starts = np.repeat(self.landscape.base[None], len(outer), axis=0)
        starts[:, list(self.outer)] = outer
        inner = self.inner
        if inner is None:
            return self._evaluated(starts[:, None, :], np.zeros((len(outer), 1)))
        outlook = self._outlook(starts, inner)
        low, high, edge = outlook.range()
        return self._settled(outlook, low, high, edge)

    def is_beyond_reach(self, columns: Columns) -> bool:
        """Tell whether the maxima took so long to find that more nodes would not help.

        Counts far from any prediction leave an integrand on which Newton's steps crawl.
        """
        each, all_together = _CRAWL * columns.inner.size, _MOST_BATCHES * rows_at_once(self.model)
        return columns.evaluations > max(each, all_together)

    def climb(self, starts: Array, moving: Indices) -> Maxima:
        """Return the maxima over some coordinates from (batch, coordinate) starting points."""
        flags = np.zeros(self.model.size, dtype=bool)
        flags[moving] = True
        rows = rows_at_once(self.model)
        tolerance = _TOLERANCE if len(starts) < _MANY else _ROUGHER
        pieces = [
            maximise(
                self.objective,
                starts[first : first + rows],
                self.counts,
                moving=flags,
                tolerance=tolerance,
                go_on=True,
            )
            for first in range(0, len(starts), rows)
        ]
        if len(pieces) == 1:
            return pieces[0]
        names = ("points", "values", "gains", "gradients", "hessians", "converged")
        arrays = {name: np.concatenate([getattr(piece, name) for piece in pieces]) for name in names}
        return Maxima(**arrays, evaluations=sum(piece.evaluations for piece in pieces))

    def _outlook(self, starts: Array, inner: int) -> Outlook:
        """Return what the linear response of the counts says about the strength in each column."""
        prior = self.model.coordinates[inner].prior
        reference = starts.copy()
        reference[:, inner] = 0.0
        events = signal_events(self.model, self.landscape, reference[:, self.model.signal])
        unit = float(prior.median)
        amplitude, information = self.landscape.amplitudes(events)
        return Outlook(
            starts,
            prior,
            amplitude * unit,
            information / unit**2,
            events.sum(axis=1) / unit,
            self.landscape.absorbed(events) / unit,
        )

    def _settled(self, outlook: Outlook, low: Array, high: Array, edge: Array) -> Columns:
        """Return columns whose inner range holds the integrand: widened or narrowed until it does."""
        steps = np.linspace(0.0, 1.0, INNER_NODES)
        columns = self._strung(outlook, low[:, None] + (high - low)[:, None] * steps)
        for _ in range(_ADJUSTMENTS):
            change, low, high = _adjusted(columns, low, high, edge)
            if not change.any() or self.is_beyond_reach(columns):
                break
            rows = np.flatnonzero(change)
            again = low[rows, None] + (high[rows] - low[rows])[:, None] * steps
            order = np.arange(len(low))
            order[rows] = len(low) + np.arange(rows.size)
            columns = columns.joined(self._strung(outlook.take(rows), again)).take(order)
        return columns

    def _strung(self, outlook: Outlook, inner: Array) -> Columns:
        """Return columns evaluated at (column, inner) nodes, nuisance coordinates starting where it says."""
        points = np.repeat(outlook.starts[:, None, :], inner.shape[1], axis=1)
        strength = outlook.prior.from_standard(inner)[0]
        points[:, :, self.nuisance] -= strength[:, :, None] * outlook.absorbed[:, None, :]
        points[:, :, self.inner] = inner
        return self._evaluated(points, inner)

    def _evaluated(self, starts: Array, inner: Array) -> Columns:
        """Return columns evaluated at given inner nodes from (column, inner, coordinate) starting points."""
        count, size = inner.shape
        index = self.inner
        found = self.climb(starts.reshape(count * size, -1), self.nuisance)
        outer = list(self.outer)
        taken_out = 0.5 * (found.points[:, outer] ** 2).sum(axis=1) + 0.5 * len(outer) * np.log(2.0 * np.pi)
        hessians = found.hessians[:, self.nuisance[:, None], self.nuisance[None, :]]
        height = found.values + found.gains + taken_out + laplace(hessians)
        height = np.where(np.isfinite(height), height, LEAST_LN_HEIGHT)
        shape = (count, size)
        return Columns(
            found.points.reshape(*shape, -1)[:, 0, outer],
            inner,
            height.reshape(shape),
            found.points.reshape(*shape, -1),
            hessians.reshape(*shape, *hessians.shape[1:]),
            found.converged.reshape(shape),
            index is not None,
            found.evaluations,
        )


def laplace(hessians: Array) -> Array:
    """Return (batch,) ln of the Gaussian integral over nuisance coordinates, (d/2) ln 2 pi - ln det(-H)/2.

    Args:
        hessians: (batch, nuisance, nuisance) Hessian of the ln integrand.

    Returns:
        (batch,) ln integral relative to the maximum [nats]; nan where -H is not positive definite.
    """
    sign, ln_det = np.linalg.slogdet(-hessians)
    return np.where(sign > 0.0, 0.5 * hessians.shape[-1] * np.log(2.0 * np.pi) - 0.5 * ln_det, np.nan)


def _adjusted(
    columns: Columns, low: Array, high: Array, edge: Array
) -> tuple[npt.NDArray[np.bool_], Array, Array]:
    """Return which columns need other ends, and the ends."""
    depth = columns.ln_height.max(axis=1, keepdims=True) - columns.ln_height
    length = high - low
    step = length / (INNER_NODES - 1)
    short_low = (depth[:, 0] < DEEP) & (low > -edge)
    short_high = (depth[:, -1] < DEEP) & (high < edge)
    far_low = (depth[:, :3] > _FAR_DOWN).all(axis=1)
    far_high = (depth[:, -3:] > _FAR_DOWN).all(axis=1)
    inside = depth < DEEP + 8.0
    first = np.argmax(inside, axis=1)
    last = INNER_NODES - 1 - np.argmax(inside[:, ::-1], axis=1)
    new_low = np.where(far_low, low + (first - 1.0) * step, low)
    new_high = np.where(far_high, low + (last + 1.0) * step, high)
    new_low = np.where(short_low, low - 0.35 * length, new_low)
    new_high = np.where(short_high, high + 0.35 * length, new_high)
    new_low, new_high = np.maximum(new_low, -edge), np.minimum(new_high, edge)
    change = short_low | short_high | far_low | far_high
    return change, new_low, new_high
