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
class Place:
    """Where one part stands among the rows of its region's directions.

    Attributes:
        piece: the part.
        row: the row of its events.
        local, by_bin: the rows of its first derivatives and of its sources that act by bin.
    """

    piece: Piece
    row: int
    local: slice
    by_bin: slice


@dataclass(frozen=True, slots=True, eq=False)
class Directions:
    """The few ways in which the coordinates change the events of one region: dT = mixing @ rows.

    A source that acts on all bins of a part alike moves the events along the part itself, so that hundreds of
    such sources need no rows of their own.

    Attributes:
        rows: (batch, row, bin) each part's events, first derivatives, and events times slopes by bin.
        mixing: (batch, coordinate, row) what each coordinate takes of them.
        places: where each part stands.
    """

    rows: Array
    mixing: Array
    places: tuple[Place, ...]

    @classmethod
    def of(cls, pieces: list[Piece], overall: Sources, slopes: Array, size: int) -> Directions:
        """Return the directions of the parts of one region."""
        batch, bins = pieces[0].events.shape
        number = sum(1 + len(piece.local) + piece.slopes.shape[1] for piece in pieces)
        rows, mixing = np.empty((batch, number, bins)), np.zeros((batch, size, number))
        places, at = [], 0
        for piece in pieces:
            middle = at + 1 + len(piece.local)
            place = Place(piece, at, slice(at + 1, middle), slice(middle, middle + piece.slopes.shape[1]))
            rows[:, at] = piece.events
            mixing[:, overall.indices, at] = slopes[:, :, piece.row]
            for row, index in enumerate(piece.local, start=at + 1):
                rows[:, row] = piece.first[row - at - 1]
                mixing[:, index, row] = 1.0
            if piece.by_bin is not None:
                np.multiply(piece.slopes, piece.events[:, None, :], out=rows[:, place.by_bin])
                mixing[:, piece.by_bin.indices, np.arange(middle, place.by_bin.stop)] = 1.0
            places.append(place)
            at = place.by_bin.stop
        return cls(rows, mixing, tuple(places))

    def contracted(self, t: Array, tt: Array) -> tuple[Array, Array]:
        """Return the derivatives along the rows of a sum over bins of a function of their events.

        Args:
            t: (batch, bin) the function's first derivative in the events.
            tt: (batch, bin) its second derivative.

        Returns:
            (batch, row) first and (batch, row, row) second derivatives.
        """
        first = (self.rows @ t[:, :, None])[..., 0]
        second = (self.rows * tt[:, None, :]) @ np.swapaxes(self.rows, 1, 2)
        for place in self.places:
            second[:, place.row, place.row] += first[:, place.row]
            for own in (place.local, place.by_bin):
                second[:, place.row, own] += first[:, own]
                second[:, own, place.row] += first[:, own]
            _add_own(place, t, second)
        return first, second


def _add_own(place: Place, t: Array, second: Array) -> None:
    """Add the second derivatives of one part's stem and of its sources by bin."""
    piece, start = place.piece, place.local.start
    for a in range(len(piece.local)):
        for b in range(len(piece.local)):
            second[:, start + a, start + b] += np.einsum("ni,ni->n", t, piece.second[a, b])
        if piece.by_bin is not None:
            cross = (piece.slopes @ (t * piece.first[a])[:, :, None])[..., 0]
            second[:, start + a, place.by_bin] += cross
            second[:, place.by_bin, start + a] += cross
    if piece.by_bin is None:
        return
    weighted = t * piece.events
    pulled = piece.slopes * weighted[:, None, :]
    second[:, place.by_bin, place.by_bin] += pulled @ np.swapaxes(piece.slopes, 1, 2)
    if piece.by_bin.is_bent:
        own = np.arange(place.by_bin.start, place.by_bin.stop)
        second[:, own, own] += (piece.bends @ weighted[:, :, None])[..., 0]


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
        for pieces in self._by_region():
            directions = Directions.of(pieces, self.overall, self.slopes, self.size)
            result[:, :, pieces[0].bins] = directions.mixing @ directions.rows
        return result

    def contracted(self, t: Array, tt: Array) -> tuple[Array, Array]:
        """Return the derivatives of a sum over bins of a function of their events.

        Args:
            t: (batch, bin) the function's first derivative in the events.
            tt: (batch, bin) its second derivative.

        Returns:
            (batch, coordinate) sum_i t_i dT_i and (batch, coordinate, coordinate)
            sum_i (tt_i dT_i dT_i' + t_i d2T_i).
        """
        gradient, hessian = np.zeros((len(t), self.size)), np.zeros((len(t), self.size, self.size))
        for pieces in self._by_region():
            bins = pieces[0].bins
            directions = Directions.of(pieces, self.overall, self.slopes, self.size)
            first, second = directions.contracted(t[:, bins], tt[:, bins])
            mixing = directions.mixing
            gradient += (mixing @ first[:, :, None])[..., 0]
            hessian += mixing @ second @ np.swapaxes(mixing, 1, 2)
            if self.overall.is_bent:
                indices, rows = self.overall.indices, [piece.row for piece in pieces]
                totals = first[:, [place.row for place in directions.places]]
                hessian[:, indices, indices] += (self.bends[:, :, rows] @ totals[:, :, None])[..., 0]
        return gradient, hessian

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
            alone, bins = replace(self, pieces=(piece,)), piece.bins
            doubled, curved = 2.0 * weights, np.zeros_like(weights)
            curved[:, bins] = doubled[:, bins] * piece.events
            hessian += alone.contracted(curved, doubled)[1]
            own = alone.gradient(*weights.shape)[:, :, bins]
            tilt[:, :, bins] += 2.0 * piece.events[:, None, :] * own
        return tilt

    def _by_region(self) -> list[list[Piece]]:
        """Return the pieces of each region, which share their bins."""
        found: dict[int, list[Piece]] = {}
        for piece in self.pieces:
            found.setdefault(piece.bins.start, []).append(piece)
        return list(found.values())


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
    local = seeds.moving(stem.local)
    events, first, second = stem.expanded(seeds, local, factor)
    return Piece(row, part.bins, local, part.by_bin, events, first, second, *by_bin)
