"""Expected counts of all parts with exact first derivatives, and second derivatives contracted with weights.

Second derivatives of the expected counts are never stored bin by bin: all that a likelihood needs of them is
sum_i w_i d2T_i/(da db), which is formed from the parts' own small pieces.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from workbench.likelihood.parts import Part, Seeds, Sources, Stem

Array = npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class Piece:
    """The events of one part (or its template's error) with the derivatives of its stem.

    Attributes:
        row: the part's row in the sources that act on all bins alike.
        bins: where the part's region stands.
        local: coordinates of the stem.
        by_bin: sources that act by bin; None without any.
        events: (batch, bin) events.
        first: (m, batch, bin) derivatives of the events in the local coordinates.
        second: (m, m, batch, bin) second derivatives in the local coordinates.
        slopes, bends: (batch, source, bin) of the sources that act by bin; empty without any.
    """

    row: int
    bins: slice
    local: tuple[int, ...]
    by_bin: Sources | None
    events: Array
    first: Array
    second: Array
    slopes: Array
    bends: Array


@dataclass(frozen=True, slots=True, eq=False)
class Expansion:
    """All parts of a hypothesis (or all template errors) at a batch of points.

    Attributes:
        size: number of coordinates.
        overall: sources that act on all bins of a part alike, one row a part.
        slopes, bends: (batch, source, part) derivatives of their ln factors.
        pieces: one a part.
    """

    size: int
    overall: Sources
    slopes: Array
    bends: Array
    pieces: tuple[Piece, ...]

    def gradient(self, batch: int, bins: int) -> Array:
        """Return (batch, coordinate, bin) first derivatives of the summed events."""
        result = np.zeros((batch, self.size, bins))
        for piece in self.pieces:
            self.add_gradient(piece, result[:, :, piece.bins])
        return result

    def add_gradient(self, piece: Piece, target: Array) -> None:
        """Add one part's first derivatives to its own bins of a (batch, coordinate, bin) array."""
        events = piece.events[:, None, :]
        if self.overall.indices.size:
            target[:, self.overall.indices] += self.slopes[:, :, piece.row, None] * events
        if piece.by_bin is not None:
            target[:, piece.by_bin.indices] += piece.slopes * events
        for slot, index in enumerate(piece.local):
            target[:, index] += piece.first[slot]

    def add_curvature(self, weights: Array, hessian: Array) -> None:
        """Add sum_i w_i d2 events_i, for (batch, bin) weights, to a (batch, coordinate, coordinate) array."""
        totals = np.empty((len(hessian), len(self.pieces)))
        for slot, piece in enumerate(self.pieces):
            weighted = weights[:, piece.bins] * piece.events
            totals[:, slot] = weighted.sum(axis=1)
            self._add_piece(piece, weights[:, piece.bins], weighted, hessian)
        indices = self.overall.indices
        if not indices.size:
            return
        rows = np.array([piece.row for piece in self.pieces])
        slopes = self.slopes[:, :, rows]
        hessian[:, indices[:, None], indices[None, :]] += (slopes * totals[:, None, :]) @ np.swapaxes(
            slopes, 1, 2
        )
        if self.overall.is_bent:
            hessian[:, indices, indices] += (self.bends[:, :, rows] @ totals[:, :, None])[..., 0]

    def add_squares(self, weights: Array, hessian: Array) -> Array:
        """Add sum_i w_i d2 V_i of V = sum of squared events to a Hessian, and return V's first derivatives.

        Args:
            weights: (batch, bin) w.
            hessian: (batch, coordinate, coordinate) what is added to.

        Returns:
            (batch, coordinate, bin) dV.
        """
        tilt = np.zeros((len(weights), self.size, weights.shape[1]))
        for piece in self.pieces:
            own = np.zeros((len(weights), self.size, piece.events.shape[1]))
            alone = replace(self, pieces=(piece,))
            alone.add_gradient(piece, own)
            tilt[:, :, piece.bins] += 2.0 * piece.events[:, None, :] * own
            doubled = 2.0 * weights[:, piece.bins]
            hessian += (own * doubled[:, None, :]) @ np.swapaxes(own, 1, 2)
            curved = np.zeros_like(weights)
            curved[:, piece.bins] = doubled * piece.events
            alone.add_curvature(curved, hessian)
        return tilt

    def _add_piece(self, piece: Piece, weights: Array, weighted: Array, hessian: Array) -> None:
        """Add what one part's stem and its sources by bin contribute, with their cross terms."""
        everywhere = self.overall.indices
        slopes = self.slopes[:, :, piece.row]
        for a, row in enumerate(piece.local):
            first = weights * piece.first[a]
            for b, column in enumerate(piece.local):
                hessian[:, row, column] += np.einsum("ni,ni->n", weights, piece.second[a, b])
            if everywhere.size:
                cross = first.sum(axis=1)[:, None] * slopes
                hessian[:, row, everywhere] += cross
                hessian[:, everywhere, row] += cross
            if piece.by_bin is not None:
                cross = (piece.slopes @ first[:, :, None])[..., 0]
                hessian[:, row, piece.by_bin.indices] += cross
                hessian[:, piece.by_bin.indices, row] += cross
        if piece.by_bin is None:
            return
        own = piece.by_bin.indices
        pulled = piece.slopes * weighted[:, None, :]
        hessian[:, own[:, None], own[None, :]] += pulled @ np.swapaxes(piece.slopes, 1, 2)
        if piece.by_bin.is_bent:
            hessian[:, own, own] += (piece.bends @ weighted[:, :, None])[..., 0]
        if everywhere.size:
            mixed = pulled.sum(axis=2)[:, :, None] * slopes[:, None, :]
            hessian[:, own[:, None], everywhere[None, :]] += mixed
            hessian[:, everywhere[:, None], own[None, :]] += np.swapaxes(mixed, 1, 2)


def expand(
    parts: tuple[Part, ...], overall: Sources, size: int, seeds: Seeds
) -> tuple[Expansion, Expansion | None]:
    """Return the events of all parts and their template errors (None without any), ready for derivatives.

    Args:
        parts: every process in every region.
        overall: sources that act on all bins of a part alike, one row a part.
        size: number of coordinates.
        seeds: (coordinate, batch) parameter values with derivatives.

    Returns:
        The expansion of the events and that of the errors.
    """
    factors, slopes, bends = overall.expanded(seeds.x)
    events, errors = [], []
    for row, part in enumerate(parts):
        factor = factors[:, row, None]
        by_bin: tuple[Array, Array] = (_EMPTY, _EMPTY)
        if part.by_bin is not None:
            own, *by_bin_list = part.by_bin.expanded(seeds.x)
            factor = factor * own
            by_bin = (by_bin_list[0], by_bin_list[1])
        events.append(_piece(row, part, part.stem, seeds, factor, by_bin))
        if part.error is not None:
            errors.append(_piece(row, part, part.error, seeds, factor, by_bin))
    whole = Expansion(size, overall, slopes, bends, tuple(events))
    return whole, Expansion(size, overall, slopes, bends, tuple(errors)) if errors else None


_EMPTY = np.zeros((0, 0, 0))


def _piece(
    row: int, part: Part, stem: Stem, seeds: Seeds, factor: Array, by_bin: tuple[Array, Array]
) -> Piece:
    value, first, second = stem.expanded(seeds)
    events = factor * value
    count = len(stem.local)
    if count:
        first = np.broadcast_to(factor * first, (count, *events.shape))
        second = np.broadcast_to(factor * second, (count, count, *events.shape))
    return Piece(row, part.bins, stem.local, part.by_bin, events, first, second, *by_bin)
