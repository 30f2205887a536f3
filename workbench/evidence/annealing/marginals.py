"""Each coordinate's own distribution, learnt from weighted points, to be drawn from and evaluated."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]

_CELLS = 64
_FROM_PRIOR = 0.25
_NARROWEST = 1e-9
_LN_2PI = float(np.log(2.0 * np.pi))


@dataclass(frozen=True, slots=True, eq=False)
class Marginals:
    """Steps of equal probability between quantiles, mixed with the standard normal.

    density(t) = 0.25 phi(t) + 0.75/(cells x width of the cell that holds t)

    Attributes:
        edges: (coordinate, cell + 1) quantiles, strictly ascending.
    """

    edges: Array

    def drawn(self, normal: Array, uniform: Array) -> Array:
        """Return (..., coordinate) draws from (..., coordinate) normal and uniform numbers."""
        place = np.clip((uniform - _FROM_PRIOR) / (1.0 - _FROM_PRIOR), 0.0, 1.0 - 1e-12) * _CELLS
        cell = place.astype(np.intp)
        rows = np.arange(len(self.edges))
        low, high = self.edges[rows, cell], self.edges[rows, cell + 1]
        return np.where(uniform < _FROM_PRIOR, normal, low + (high - low) * (place - cell))

    def ln_density(self, points: Array) -> Array:
        """Return the (..., coordinate) ln density of each coordinate [nats]."""
        steps = np.zeros(points.shape)
        for index, edges in enumerate(self.edges):
            cell = np.searchsorted(edges, points[..., index], side="right") - 1
            inside = (cell >= 0) & (cell < _CELLS)
            width = np.diff(edges)[np.clip(cell, 0, _CELLS - 1)]
            steps[..., index] = np.where(inside, 1.0 / (_CELLS * width), 0.0)
        prior = np.exp(-0.5 * points**2 - 0.5 * _LN_2PI)
        return np.asarray(np.log(np.maximum(_FROM_PRIOR * prior + (1.0 - _FROM_PRIOR) * steps, 1e-300)))


def marginals(points: Array, weights: Array) -> Marginals:
    """Return the marginals of (point, coordinate) points with (point,) weights that add up to 1."""
    order = np.argsort(points, axis=0)
    wanted = np.linspace(0.0, 1.0, _CELLS + 1)
    edges = np.stack(
        [
            np.interp(wanted, np.cumsum(weights[rows]), column[rows])
            for column, rows in zip(points.T, order.T, strict=True)
        ]
    )
    least = _NARROWEST * np.arange(_CELLS + 1) * (1.0 + np.abs(edges).max(axis=1, keepdims=True))
    return Marginals(np.maximum.accumulate(edges, axis=1) + least)
