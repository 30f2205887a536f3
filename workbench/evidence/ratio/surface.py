"""The updating ratio as a surface over signal parameters, read between its nodes."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
import numpy.typing as npt

from workbench.evidence.ratio.panels import Panels
from workbench.evidence.ratio.strengths import Strengths, between, larger_beside

Array = npt.NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Surface:
    """ln R at nodes over signal parameters.

    Attributes:
        panels: nodes along every parameter but the last strength.
        strengths: nodes of the last strength in each column; None where it is not among the parameters.
        ln_ratio: (column, node) ln R [nats]; columns in the order of the panels' product, the last running
            fastest; one node where there is no strength.
        error: (column, node) one standard error, what lies between nodes included [nats].
    """

    panels: tuple[Panels, ...]
    strengths: Strengths | None
    ln_ratio: Array
    error: Array

    @property
    def names(self) -> tuple[str, ...]:
        """Return the parameters, the last strength last."""
        last = () if self.strengths is None else (self.strengths.name,)
        return (*(one.name for one in self.panels), *last)

    @property
    def ranges(self) -> dict[str, tuple[float, float]]:
        """Return each parameter's range."""
        found = {one.name: one.range for one in self.panels}
        if self.strengths is not None:
            found[self.strengths.name] = (self.strengths.low, self.strengths.high)
        return found

    @cached_property
    def shape(self) -> tuple[int, ...]:
        """Return the number of nodes along each of the panels."""
        return tuple(one.nodes.size for one in self.panels)

    @cached_property
    def outer(self) -> Array:
        """Return (column, outer) parameter values of the columns."""
        return product([one.nodes for one in self.panels])

    @property
    def nodes(self) -> Array:
        """Return (column, node, parameter) values at every node."""
        outer = np.repeat(self.outer[:, None, :], self.ln_ratio.shape[1], axis=1)
        if self.strengths is None:
            return outer
        return np.concatenate([outer, self.strengths.nodes[:, :, None]], axis=2)

    def at(self, points: Array) -> tuple[Array, Array]:
        """Return ln R and its error anywhere inside the ranges.

        Args:
            points: (point, parameter) values in the order of `names`.

        Returns:
            (point,) ln R [nats] and (point,) one standard error.
        """
        columns, weights = self._around(points)
        if self.strengths is None:
            values, errors = self.ln_ratio[columns, 0], self.error[columns, 0]
        else:
            flat = columns.ravel()
            strength = np.repeat(points[:, -1], columns.shape[1])[:, None]
            place = self.strengths.take(flat).place(strength)
            values = between(self.ln_ratio[flat], place)[:, 0].reshape(columns.shape)
            errors = larger_beside(self.error[flat], place)[:, 0].reshape(columns.shape)
        nearest = np.argmax(np.abs(weights), axis=1)
        return (values * weights).sum(axis=1), errors[np.arange(len(points)), nearest]

    def _around(self, points: Array) -> tuple[npt.NDArray[np.intp], Array]:
        """Return (point, neighbour) columns around each point and what each counts for."""
        columns = np.zeros((len(points), 1), dtype=np.intp)
        weights = np.ones((len(points), 1))
        for place, panels in enumerate(self.panels):
            nodes, share = panels.weights(points[:, place])
            columns = (columns[:, :, None] * panels.nodes.size + nodes[:, None, :]).reshape(len(points), -1)
            weights = (weights[:, :, None] * share[:, None, :]).reshape(len(points), -1)
        return columns, weights


def product(nodes: list[Array]) -> Array:
    """Return (column, parameter) values of the product of nodes, the last running fastest."""
    if not nodes:
        return np.zeros((1, 0))
    mesh = np.meshgrid(*nodes, indexing="ij")
    return np.stack([part.ravel() for part in mesh], axis=1)
