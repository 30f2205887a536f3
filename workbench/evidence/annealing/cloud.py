"""Joint distribution of a few coordinates, learnt from points: a bell on each, as wide as neighbours lie."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]
Indices = npt.NDArray[np.intp]

_BELLS = 128
_NEIGHBOURS = 8
_FROM_PRIOR = 0.25
_ROWS = 2048
_LN_2PI = float(np.log(2.0 * np.pi))


@dataclass(frozen=True, slots=True, eq=False)
class Cloud:
    """Bells of equal weight, mixed with the standard normal.

    density(t) = 0.25 N(t; 0, 1) + 0.75/bells x sum over bells of N(t; centre, widths^2)

    Attributes:
        coordinates: (block,) which coordinates these are.
        centres, widths: (bell, block).
    """

    coordinates: Indices
    centres: Array
    widths: Array

    def drawn(self, normal: Array, choice: Array, origin: Array) -> Array:
        """Return (..., block) draws from (..., block) normal and two sets of (...,) uniform numbers."""
        bell = (choice * len(self.centres)).astype(np.intp)
        around = self.centres[bell] + self.widths[bell] * normal
        return np.where((origin < _FROM_PRIOR)[..., None], normal, around)

    def ln_density(self, points: Array) -> Array:
        """Return the (...,) ln density at (..., block) points [nats]."""
        flat = points.reshape(-1, points.shape[-1])
        pieces = [self._density(flat[first : first + _ROWS]) for first in range(0, len(flat), _ROWS)]
        return np.log(np.maximum(np.concatenate(pieces), 1e-300)).reshape(points.shape[:-1])

    def _density(self, points: Array) -> Array:
        square = np.zeros((len(points), len(self.centres)))
        for index, (centre, width) in enumerate(zip(self.centres.T, self.widths.T, strict=True)):
            square += ((points[:, index, None] - centre) / width) ** 2
        height = np.exp(-0.5 * self.centres.shape[1] * _LN_2PI) / self.widths.prod(axis=1)
        bells = np.exp(-0.5 * square) @ height / len(self.centres)
        prior = np.exp(-0.5 * (points**2).sum(axis=1) - 0.5 * points.shape[1] * _LN_2PI)
        return np.asarray(_FROM_PRIOR * prior + (1.0 - _FROM_PRIOR) * bells)


def cloud(points: Array, coordinates: Indices) -> Cloud:
    """Return the cloud of some coordinates of (point, coordinate) equally weighted points."""
    own = points[:, coordinates]
    chosen = np.linspace(0, len(own) - 1, _BELLS).astype(np.intp)
    scaled = own / np.maximum(own.std(axis=0), 1e-12)
    square = (scaled**2).sum(axis=1)
    distance = square[chosen, None] + square - 2.0 * scaled[chosen] @ scaled.T
    nearest = np.argpartition(distance, _NEIGHBOURS, axis=1)[:, : _NEIGHBOURS + 1]
    widths = own[nearest].std(axis=1)
    least = 1e-9 * (1.0 + np.abs(own).max(axis=0))
    return Cloud(coordinates, own[chosen], np.maximum(widths, least))
