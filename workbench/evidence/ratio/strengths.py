"""Strength nodes in each column: dense where the updating ratio lives, and out to the ends of the range.

In y = sqrt(s + s0), s0 the strength that the background is worth, Poisson counts have the same width
everywhere. Nodes are evenly spaced in

    asinh((y - centre)/scale) + asinh((y - low)/near)/2

evenly around the centre, geometrically far from it, and closer at the lower end: there ln R is read from one
side only, and where the background is next to nothing it runs as the logarithm of s + s0.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]
Indices = npt.NDArray[np.intp]

_ON_A_NODE = 1e-9
_LEAST = 1e-300
_BISECTIONS = 60
_POINTS = 6  # nodes that a value between nodes is read from


@dataclass(frozen=True, eq=False)
class Strengths:
    """Where the strength nodes of each column stand.

    Attributes:
        name: the strength.
        low, high: ends of the range, the same in all columns.
        offset: (column,) strength that the background is worth, s0 > -low.
        centre: (column,) strength around which the nodes are dense.
        scale: (column,) length over which they are evenly spaced, in y.
        number: nodes in each column.
        known: (column, node) the nodes themselves where they are known, as they stand in a record.
    """

    name: str
    low: float
    high: float
    offset: Array
    centre: Array
    scale: Array
    number: int
    known: Array | None = None

    @cached_property
    def nodes(self) -> Array:
        """Return (column, node) ascending strengths; the first and last are the ends exactly."""
        if self.known is not None:
            return self.known
        place = np.broadcast_to(np.arange(self.number, dtype=float), (len(self.offset), self.number))
        low = np.sqrt(np.maximum(self.low + self.offset, _LEAST))[:, None]
        high = np.sqrt(np.maximum(self.high + self.offset, _LEAST))[:, None]
        low, high = (end * np.ones_like(place) for end in (low, high))
        for _ in range(_BISECTIONS):
            middle = np.where(low > 0.1 * high, 0.5 * (low + high), np.sqrt(low * high))
            is_below = self._place_in_y(middle) < place
            low, high = np.where(is_below, middle, low), np.where(is_below, high, middle)
        found = np.clip(low * low - self.offset[:, None], self.low, self.high)
        found[:, 0], found[:, -1] = self.low, self.high
        return np.asarray(found)

    def refined(self, number: int) -> Array:
        """Return (column, point) strengths: the nodes, and so many even steps in each interval between."""
        nodes = self.nodes
        steps = np.arange(number) / number
        inside = nodes[:, :-1, None] + np.diff(nodes, axis=1)[:, :, None] * steps
        return np.concatenate([inside.reshape(len(nodes), -1), nodes[:, -1:]], axis=1)

    def place(self, strength: Array) -> Array:
        """Return (column, point) places, counted in nodes, of (column, point) strengths."""
        y = np.sqrt(np.maximum(strength + self.offset[:, None], _LEAST))
        return np.asarray(np.clip(self._place_in_y(y), 0.0, self.number - 1.0))

    def _place_in_y(self, y: Array) -> Array:
        start, span = self.graded
        found = (self._grade(y) - start[:, None]) * ((self.number - 1) / span)[:, None]
        return np.asarray(found)

    def _grade(self, y: Array) -> Array:
        middle = np.sqrt(np.maximum(self.centre + self.offset, _LEAST))
        low = np.sqrt(np.maximum(self.low + self.offset, _LEAST))
        near = np.minimum(2.0 * low, 0.5 * self.scale)
        found = np.arcsinh((y - middle[:, None]) / self.scale[:, None])
        found += 0.5 * np.arcsinh((y - low[:, None]) / near[:, None])
        return np.asarray(found)

    def take(self, rows: Indices) -> Strengths:
        """Return some columns."""
        return replace(
            self,
            offset=self.offset[rows],
            centre=self.centre[rows],
            scale=self.scale[rows],
            known=None if self.known is None else self.known[rows],
        )

    def joined(self, other: Strengths) -> Strengths:
        """Return these columns and others of the same strength."""
        return replace(
            self,
            offset=np.concatenate([self.offset, other.offset]),
            centre=np.concatenate([self.centre, other.centre]),
            scale=np.concatenate([self.scale, other.scale]),
            known=None,
        )

    @cached_property
    def graded(self) -> tuple[Array, Array]:
        """Return (column,) where the even spacing starts, and its length."""
        ends = np.sqrt(np.maximum(np.array([self.low, self.high]) + self.offset[:, None], _LEAST))
        first, last = self._grade(ends).T
        return first, last - first


def between(values: Array, place: Array, points: int = _POINTS) -> Array:
    """Return values between evenly numbered nodes: the polynomial through the nearest ones.

    Args:
        values: (column, node) values.
        place: (column, point) places counted in nodes; inside [0, nodes - 1].
        points: nodes that each value is read from.

    Returns:
        (column, point) values.

    Source:
        Lagrange's formula.
    """
    last = values.shape[1] - points
    first = np.clip(np.floor(place).astype(np.intp) - (points // 2 - 1), 0, max(last, 0))
    x = place - first
    flat = values.ravel()
    start = first + np.arange(len(values))[:, None] * values.shape[1]
    found = np.zeros_like(x)
    for k in range(points):
        others = [j for j in range(points) if j != k]
        weight = (x - others[0]) / float(np.prod([k - j for j in others]))
        for j in others[1:]:
            weight *= x - j
        weight *= flat[start + k]
        found += weight
    return found


def larger_beside(values: Array, place: Array) -> Array:
    """Return (column, point) the larger of the two (column, node) values beside each place."""
    rows = np.arange(len(values))[:, None]
    below = np.floor(place + _ON_A_NODE).astype(np.intp)
    above = np.minimum(np.ceil(place - _ON_A_NODE).astype(np.intp), values.shape[1] - 1)
    return np.asarray(np.maximum(values[rows, below], values[rows, above]))


def doubt_between(values: Array) -> Array:
    """Return (column, node) how far values read between nodes may be off, near each node.

    Where six nodes and four differ, six are better by about the factor by which terms fall: a fifth of the
    difference is stated, and the whole in the first and last interval, whose nodes stand on one side.
    """
    middle = np.arange(values.shape[1] - 1) + 0.5
    place = np.broadcast_to(middle, (len(values), len(middle)))
    gap = 0.2 * np.abs(between(values, place, 6) - between(values, place, 4))
    gap[:, [0, -1]] *= 5.0
    padded = np.concatenate([gap[:, :1], gap, gap[:, -1:]], axis=1)
    return np.asarray(np.maximum(padded[:, 1:], padded[:, :-1]))
