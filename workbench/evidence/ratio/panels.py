"""Panels along a signal parameter on which a smooth curve is read between nodes.

Each panel has seven Chebyshev-Lobatto nodes, its ends among them, so that neighbours share a node and the
whole range is covered to its ends.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from typing import TypeVar

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]
Indices = npt.NDArray[np.intp]

Number = TypeVar("Number", np.float64, np.intp)

ORDER = 6
_RATIOS = (0.1, 0.7)  # smaller ones are chance
_CAUTIOUS = 1.5
_MANY = 16  # values at a node from which panels are done one by one


@lru_cache(maxsize=1)
def _places() -> Array:
    """Return (node,) positions in [-1, 1], ascending."""
    return -np.cos(np.pi * np.arange(ORDER + 1) / ORDER)


@lru_cache(maxsize=1)
def _to_coefficients() -> Array:
    """Return (term, node): Chebyshev coefficients of the polynomial through values at the nodes."""
    terms = np.cos(np.outer(np.arange(ORDER + 1), np.arccos(np.clip(_places(), -1.0, 1.0))))
    return np.asarray(np.linalg.inv(terms.T))


@dataclass(frozen=True, slots=True, eq=False)
class Panels:
    """Nodes along one signal parameter.

    Attributes:
        name, unit: the parameter.
        edges: (panel + 1,) ascending panel ends, in the parameter itself.
    """

    name: str
    unit: str
    edges: Array

    @property
    def nodes(self) -> Array:
        """Return (node,) ascending parameter values: six a panel, and the last end."""
        middle, half = 0.5 * (self.edges[1:] + self.edges[:-1]), 0.5 * np.diff(self.edges)
        inside = middle[:, None] + half[:, None] * _places()[1:-1]
        whole = np.concatenate([self.edges[:-1, None], inside], axis=1)
        return np.append(whole.ravel(), self.edges[-1])

    @property
    def range(self) -> tuple[float, float]:
        """Return the ends."""
        return float(self.edges[0]), float(self.edges[-1])

    def by_panel(self, values: npt.NDArray[Number]) -> npt.NDArray[Number]:
        """Return (panel, 7, ...) values of (node, ...) ones, shared nodes repeated."""
        count = len(self.edges) - 1
        found: npt.NDArray[Number] = values[np.arange(count)[:, None] * ORDER + np.arange(ORDER + 1)]
        return found

    def place(self, x: Array) -> tuple[Indices, Array]:
        """Return (point,) panel of each value and (point, 7) Chebyshev terms there; outside, the end's."""
        panel = np.clip(np.searchsorted(self.edges, x, side="right") - 1, 0, len(self.edges) - 2)
        low, high = self.edges[panel], self.edges[panel + 1]
        u = np.clip((2.0 * x - low - high) / (high - low), -1.0, 1.0)
        terms = [np.ones_like(u), u]
        for _ in range(ORDER - 1):
            terms.append(2.0 * u * terms[-1] - terms[-2])
        return panel, np.stack(terms, axis=1)

    def weights(self, x: Array) -> tuple[Indices, Array]:
        """Return (point, 7) nodes around each value and (point, 7) what each counts for there."""
        panel, terms = self.place(x)
        return panel[:, None] * ORDER + np.arange(ORDER + 1), terms @ _to_coefficients()

    def between(self, values: Array, x: Array) -> Array:
        """Return (point, ...) values between nodes.

        Args:
            values: (node, ...) values at the nodes.
            x: (point,) parameter values; outside the range the end counts.
        """
        panel, terms = self.place(x)
        coefficients = np.einsum("tk,pk...->pt...", _to_coefficients(), self.by_panel(values))
        if values[0].size < _MANY:
            return np.asarray(np.einsum("xt,xt...->x...", terms, coefficients[panel]))
        found = np.empty((x.size, values[0].size))
        for one in np.unique(panel):
            rows = np.flatnonzero(panel == one)
            found[rows] = terms[rows] @ coefficients[one].reshape(ORDER + 1, -1)
        return found.reshape(x.size, *values.shape[1:])

    @staticmethod
    def left_out(values: Array) -> Array:
        """Return (panel, ...) size of what the polynomials through (panel, 7, ...) values leave out.

        Terms fall geometrically for a curve that is analytic around a panel: with t the size of the last two
        and q its ratio to that of the two before, t (q + q^2 + ...) is left out.
        """
        terms = np.einsum("tk,pk...->pt...", _to_coefficients(), values)
        before = np.sqrt((terms[:, -4:-2] ** 2).sum(axis=1))
        last = np.maximum(np.sqrt((terms[:, -2:] ** 2).sum(axis=1)), _RATIOS[0] * before)
        ratio = np.clip(last / np.maximum(before, 1e-300), *_RATIOS)
        return np.asarray(_CAUTIOUS * last * ratio / (1.0 - ratio))

    def split(self, panels: Indices) -> Panels:
        """Return the same range with the given panels cut in half."""
        middle = 0.5 * (self.edges[panels] + self.edges[panels + 1])
        return Panels(self.name, self.unit, np.sort(np.concatenate([self.edges, middle])))
