"""The integrand at nodes: signal coordinates held, everything else at its maximum and integrated by Laplace.

Outer coordinates (masses, widths, all strengths but the last) stand on the axes' nodes in prior probability.
The last strength, the inner coordinate, has in each column its own evenly spaced nodes in its standard-normal
coordinate, over the range where the integrand lives.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from workbench.evidence.search import Landscape, signal_events
from workbench.likelihood.model import Model
from workbench.likelihood.newton import Maxima, maximise, solve_definite
from workbench.likelihood.objective import StandardObjective, rows_at_once

Array = npt.NDArray[np.float64]
Indices = npt.NDArray[np.intp]

INNER_NODES = 15
_REACH = 5.3
_DEEP = 7.5
_TOO_DEEP = 60.0
_EDGE = 8.3
_TOLERANCE = 1e-5
_ROUGHLY = 1e-2


@dataclass(frozen=True, slots=True, eq=False)
class Columns:
    """Nodes of one hypothesis.

    Attributes:
        outer: (column, outer) standard coordinates of the outer signal coordinates.
        inner: (column, inner) standard coordinates of the inner one; (column, 1) zeros where there is none.
        ln_height: (column, inner) ln of the integrand with the nuisance coordinates integrated, the outer prior
            density taken out [nats].
        points: (column, inner, coordinate) where the nuisance coordinates' maximum is.
        hessians: (column, inner, coordinate, coordinate) Hessian of the ln integrand there.
        converged: (column, inner) True where the maximisation converged.
        has_inner: False when every signal coordinate is an outer one.
    """

    outer: Array
    inner: Array
    ln_height: Array
    points: Array
    hessians: Array
    converged: npt.NDArray[np.bool_]
    has_inner: bool

    def ln_integral(self) -> Array:
        """Return (column,) ln of the integral over the inner coordinate."""
        if not self.has_inner:
            return self.ln_height[:, 0]
        top = self.ln_height.max(axis=1)
        heights = np.exp(self.ln_height - top[:, None])
        return np.asarray(top + np.log(heights.sum(axis=1) * (self.inner[:, 1] - self.inner[:, 0])))

    def inner_error(self) -> Array:
        """Return (column,) relative error of the inner integral.

        Halving the spacing squares the relative error of the trapezoidal rule for an analytic bell, so that the
        square of the difference to every second node is its size.
        """
        if not self.has_inner:
            return np.zeros(len(self.outer))
        heights = np.exp(self.ln_height - self.ln_height.max(axis=1, keepdims=True))
        coarse = 2.0 * heights[:, ::2].sum(axis=1) / heights.sum(axis=1) - 1.0
        return np.asarray(coarse**2 + np.maximum(heights[:, 0], heights[:, -1]))

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
        )


@dataclass(frozen=True, slots=True, eq=False)
class Integrand:
    """What is integrated: a model with its counts and the landscape that its starting points come from."""

    model: Model
    counts: Array
    landscape: Landscape

    @property
    def inner(self) -> int | None:
        """Return the coordinate of the last strength, or None."""
        signal = self.model.signal
        if signal.size and self.model.coordinates[signal[-1]].is_strength:
            return int(signal[-1])
        return None

    @property
    def outer(self) -> tuple[int, ...]:
        """Return the other signal coordinates."""
        return tuple(int(index) for index in self.model.signal if index != self.inner)

    @property
    def nuisance(self) -> Indices:
        """Return the coordinates that are integrated by Laplace."""
        return np.setdiff1d(np.arange(self.model.size), self.model.signal)

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
        starts[:, inner] = self._inner_guess(starts)
        modes = self.climb(starts, np.append(self.nuisance, inner), tolerance=_ROUGHLY)
        width = _widths(modes.hessians, self.nuisance, inner)
        centre = modes.points[:, inner]
        low, high = centre - _REACH * width, centre + _REACH * width
        edge = np.maximum(_EDGE, np.abs(centre) + 4.0)
        return self._settled(modes, np.maximum(low, -edge), np.minimum(high, edge), edge)

    def climb(self, starts: Array, moving: Indices, tolerance: float = _TOLERANCE) -> Maxima:
        """Return the maxima over some coordinates from (batch, coordinate) starting points."""
        objective = StandardObjective(self.model)
        flags = np.zeros(self.model.size, dtype=bool)
        flags[moving] = True
        rows = rows_at_once(self.model)
        pieces = [
            maximise(objective, starts[first : first + rows], self.counts, moving=flags, tolerance=tolerance)
            for first in range(0, len(starts), rows)
        ]
        if len(pieces) == 1:
            return pieces[0]
        return Maxima(
            *(
                np.concatenate([getattr(piece, name) for piece in pieces])
                for name in ("points", "values", "gradients", "hessians", "converged")
            )
        )

    def _inner_guess(self, starts: Array) -> Array:
        """Return standard coordinates of the strength that the linear response finds best."""
        index = self.inner
        if index is None:
            return np.zeros(len(starts))
        prior = self.model.coordinates[index].prior
        reference = starts.copy()
        reference[:, index] = 0.0
        events = signal_events(self.model, self.landscape, reference[:, self.model.signal])
        amplitude, information = self.landscape.amplitudes(events)
        middle = float(prior.median)
        low, high = (float(end) for end in prior.quantile(np.array([1e-4, 1.0 - 1e-6])))
        floor = 0.3 / np.sqrt(information)
        guess = np.clip(np.maximum(amplitude, floor) * middle, low, high)
        return np.asarray(prior.to_standard(guess))

    def _settled(self, modes: Maxima, low: Array, high: Array, edge: Array) -> Columns:
        """Return columns whose inner range holds the integrand: widened or narrowed until it does."""
        steps = np.linspace(0.0, 1.0, INNER_NODES)
        inner = low[:, None] + (high - low)[:, None] * steps
        starts = self._followed(modes, inner, np.arange(len(inner)))
        columns = self._evaluated(starts, inner)
        for _ in range(8):
            change, low, high = _adjusted(columns, low, high, edge)
            if not change.any():
                break
            rows = np.flatnonzero(change)
            again = low[rows, None] + (high[rows] - low[rows])[:, None] * steps
            redone = self._evaluated(self._followed(modes, again, rows), again)
            order = np.arange(len(inner))
            order[rows] = len(inner) + np.arange(rows.size)
            columns = columns.joined(redone).take(order)
        return columns

    def _followed(self, modes: Maxima, inner: Array, rows: Indices) -> Array:
        """Return (column, inner, coordinate) starting points: modes moved along their response to the strength."""
        index, nuisance = self.inner, self.nuisance
        points = np.repeat(modes.points[rows, None, :], inner.shape[1], axis=1)
        offset = np.clip(inner - points[:, :, index], -1.5, 1.5)
        block = -modes.hessians[rows][:, nuisance[:, None], nuisance[None, :]]
        response = solve_definite(block, modes.hessians[rows][:, nuisance, index], np.ones(nuisance.size))
        points[:, :, nuisance] += offset[:, :, None] * response[:, None, :]
        points[:, :, index] = inner
        return points

    def _evaluated(self, starts: Array, inner: Array) -> Columns:
        """Return columns evaluated at given inner nodes from (column, inner, coordinate) starting points."""
        count, size = inner.shape
        index = self.inner
        found = self.climb(starts.reshape(count * size, -1), self.nuisance)
        outer = list(self.outer)
        taken_out = 0.5 * (found.points[:, outer] ** 2).sum(axis=1) + 0.5 * len(outer) * np.log(2.0 * np.pi)
        height = found.values + taken_out + laplace(found.hessians, self.nuisance)
        height = np.where(np.isfinite(height), height, -1e300)
        shape = (count, size)
        return Columns(
            found.points.reshape(*shape, -1)[:, 0, outer],
            inner,
            height.reshape(shape),
            found.points.reshape(*shape, -1),
            found.hessians.reshape(*shape, self.model.size, self.model.size),
            found.converged.reshape(shape),
            index is not None,
        )


def laplace(hessians: Array, nuisance: Indices) -> Array:
    """Return (batch,) ln of the Gaussian integral over the nuisance coordinates, (d/2) ln 2 pi - ln det(-H)/2.

    Args:
        hessians: (batch, coordinate, coordinate) Hessian of the ln integrand.
        nuisance: coordinates to integrate.

    Returns:
        (batch,) ln integral relative to the maximum [nats]; nan where -H is not positive definite.
    """
    block = -hessians[:, nuisance[:, None], nuisance[None, :]]
    sign, ln_det = np.linalg.slogdet(block)
    return np.where(sign > 0.0, 0.5 * nuisance.size * np.log(2.0 * np.pi) - 0.5 * ln_det, np.nan)


def _widths(hessians: Array, nuisance: Indices, inner: int) -> Array:
    """Return (batch,) marginal width of the inner coordinate from the curvature at the mode."""
    chosen = np.append(nuisance, inner)
    block = -hessians[:, chosen[:, None], chosen[None, :]]
    values, vectors = np.linalg.eigh(block)
    variance = (vectors[:, -1, :] ** 2 / np.maximum(values, 0.05)).sum(axis=1)
    return np.sqrt(np.clip(variance, 1e-12, 4.0))


def _adjusted(columns: Columns, low: Array, high: Array, edge: Array) -> tuple[npt.NDArray[np.bool_], Array, Array]:
    """Return which columns need other ends, and the ends."""
    depth = columns.ln_height.max(axis=1, keepdims=True) - columns.ln_height
    length = high - low
    step = length / (INNER_NODES - 1)
    short_low = (depth[:, 0] < _DEEP) & (low > -edge)
    short_high = (depth[:, -1] < _DEEP) & (high < edge)
    far_low = (depth[:, :3] > _TOO_DEEP).all(axis=1)
    far_high = (depth[:, -3:] > _TOO_DEEP).all(axis=1)
    inside = depth < _DEEP + 8.0
    first = np.argmax(inside, axis=1)
    last = INNER_NODES - 1 - np.argmax(inside[:, ::-1], axis=1)
    new_low = np.where(far_low, low + (first - 1.0) * step, low)
    new_high = np.where(far_high, low + (last + 1.0) * step, high)
    new_low = np.where(short_low, low - 0.35 * length, new_low)
    new_high = np.where(short_high, high + 0.35 * length, new_high)
    new_low, new_high = np.maximum(new_low, -edge), np.minimum(new_high, edge)
    change = short_low | short_high | far_low | far_high
    return change, new_low, new_high
