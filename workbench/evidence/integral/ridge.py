"""Following a curved ridge: the direction along which an integrand is farthest from its Gaussian.

At each node along that direction all other nuisance coordinates are maximised again and integrated by Laplace
there, so that neither the ridge's curve nor its uneven height is approximated.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from workbench.evidence.integral.piecewise import between, distribution, draw
from workbench.likelihood.newton import maximise
from workbench.likelihood.objective import Objective

Array = npt.NDArray[np.float64]

_NODES = 21
_DEEP = 14.0
_FAR = 40.0
_ROUNDS = 8
_TOLERANCE = 1e-4
MOST_FOLLOWED = 24  # nuisance coordinates, of which the others are maximised along a ridge


@dataclass(frozen=True, slots=True, eq=False)
class Turned:
    """An objective in whitened nuisance coordinates around a point, everything else held.

    Attributes:
        objective: the objective in its own coordinates.
        centre: (coordinate,) the point.
        nuisance: coordinates that are whitened.
        outward: (coordinate of those, whitened) inverse of the whitening.
    """

    objective: Objective
    centre: Array
    nuisance: npt.NDArray[np.intp]
    outward: Array

    @property
    def low(self) -> Array:
        """Return the lower ends: none."""
        return np.full(self.nuisance.size, -np.inf)

    @property
    def high(self) -> Array:
        """Return the upper ends: none."""
        return np.full(self.nuisance.size, np.inf)

    def value(self, points: Array, counts: Array) -> Array:
        """Return (batch,) values at (batch, whitened) points."""
        return self.objective.value(self._placed(points), counts)

    def derivatives(self, points: Array, counts: Array) -> tuple[Array, Array, Array]:
        """Return values, gradients and Hessians in the whitened coordinates."""
        value, gradient, hessian = self.objective.derivatives(self._placed(points), counts)
        block = hessian[:, self.nuisance[:, None], self.nuisance[None, :]]
        return value, gradient[:, self.nuisance] @ self.outward, self.outward.T @ block @ self.outward

    def _placed(self, points: Array) -> Array:
        placed = np.repeat(self.centre[None], len(points), axis=0)
        placed[:, self.nuisance] += points @ self.outward.T
        return placed


@dataclass(frozen=True, slots=True, eq=False)
class Ridge:
    """Nodes along the first whitened coordinate.

    Attributes:
        nodes: (node,) evenly spaced positions.
        ln_heights: (node,) ln of the integrand with the other coordinates integrated, relative to the
            Gaussian's maximum.
        centres: (node, rest) maxima of the other whitened coordinates.
        roots: (node, rest, rest) upper-triangular R with R'R = -Hessian in them.
    """

    nodes: Array
    ln_heights: Array
    centres: Array
    roots: Array

    @property
    def ln_correction(self) -> float:
        """Return ln of the sum along the ridge over the Gaussian's integral."""
        step = self.nodes[1] - self.nodes[0]
        return float(np.log(np.exp(self.ln_heights).sum() * step / np.sqrt(2.0 * np.pi)))

    @property
    def error(self) -> float:
        """Return the error of that sum: its difference to every second node's, squared, plus the ends."""
        heights = np.exp(self.ln_heights - self.ln_heights.max())
        coarse = 2.0 * heights[::2].sum() / heights.sum() - 1.0
        return float(coarse**2 + max(heights[0], heights[-1]))

    def place(self, u: Array) -> Array:
        """Return (draw,) positions along the ridge from uniform numbers."""
        return draw(*self._padded, u)

    def share(self, position: Array) -> tuple[Array, Array]:
        """Return distribution function and density of positions along the ridge."""
        return distribution(*self._padded, position)

    def across(self, position: Array) -> tuple[Array, Array]:
        """Return (draw, rest) centre and (draw, rest, rest) root of the other coordinates, between nodes."""
        below, share = between(self.nodes, position)
        left, right = (1.0 - share)[:, None], share[:, None]
        centre = left * self.centres[below] + right * self.centres[below + 1]
        return centre, left[..., None] * self.roots[below] + right[..., None] * self.roots[below + 1]

    @property
    def _padded(self) -> tuple[Array, Array]:
        step = self.nodes[1] - self.nodes[0]
        nodes = np.concatenate([[self.nodes[0] - step], self.nodes, [self.nodes[-1] + step]])
        heights = np.exp(self.ln_heights - self.ln_heights.max())
        return nodes, np.concatenate([[0.0], heights, [0.0]])


def follow(turned: Turned, counts: Array, curve: Array) -> Ridge | None:
    """Return the ridge along the first whitened coordinate, or None where it cannot be followed.

    Args:
        turned: the integrand in whitened coordinates, its maximum at 0.
        counts: (bin,) observed counts [events].
        curve: (rest,) second derivatives of the other coordinates' maxima along the ridge, to start from.

    Returns:
        Nodes that reach down by 14 nats on both sides.
    """
    size = turned.nuisance.size
    if size > MOST_FOLLOWED:
        return None
    low, high = -6.0, 6.0
    moving = np.ones(size, dtype=bool)
    moving[0] = False
    for _ in range(_ROUNDS):
        nodes = np.linspace(low, high, _NODES)
        starts = np.zeros((_NODES, size))
        starts[:, 0] = nodes
        starts[:, 1:] = 0.5 * np.clip(nodes, -4.0, 4.0)[:, None] ** 2 * curve
        found = maximise(turned, starts, counts, moving=moving, tolerance=_TOLERANCE)
        block = -found.hessians[:, 1:, 1:]
        sign, ln_det = np.linalg.slogdet(block)
        if not (found.converged.all() and (sign > 0.0).all()):
            return None
        origin = turned.value(np.zeros((1, size)), counts)[0]
        ln_heights = found.values + found.gains - origin - 0.5 * ln_det
        low, high, changed = _reached(nodes, ln_heights)
        if not changed:
            roots = np.swapaxes(np.linalg.cholesky(block), 1, 2)
            return Ridge(nodes, ln_heights, found.points[:, 1:], roots)
    return None


def _reached(nodes: Array, ln_heights: Array) -> tuple[float, float, bool]:
    """Return ends that hold the ridge, and whether they differ from the present ones."""
    depth = ln_heights.max() - ln_heights
    low, high, step = float(nodes[0]), float(nodes[-1]), float(nodes[1] - nodes[0])
    inside = np.flatnonzero(depth < _DEEP + 2.0)
    length = high - low
    new_low, new_high = low, high
    if depth[0] < _DEEP:
        new_low = low - 0.4 * length
    elif depth[0] > _FAR:
        new_low = low + (inside[0] - 1.0) * step
    if depth[-1] < _DEEP:
        new_high = high + 0.4 * length
    elif depth[-1] > _FAR:
        new_high = low + (inside[-1] + 1.0) * step
    changed = abs(new_low - low) + abs(new_high - high) > 0.5 * step
    return new_low, new_high, changed
