"""The mixture that draws come from, built on the quadrature's nodes.

Between nodes the proposal interpolates. A draw takes its signal coordinates from the density that is linear
between the nodes' heights (or, one time in nine, from their prior, so that a mode the search missed shows in
the weights), then the nuisance coordinates from the law that Laplace found at a neighbouring node, bent along
the third derivatives or the ridge, shifted along the exact response of its maximum to the signal coordinates,
its tails a little heavier than normal.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from itertools import product

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.evidence.integral.axes import Axis, standard
from workbench.evidence.integral.bending import RidgeMap, TriangularMap, following
from workbench.evidence.integral.matrices import grouped, unwhitened, upper_roots
from workbench.evidence.integral.piecewise import between, draw, hat_areas, taken
from workbench.evidence.integral.quadrature import Grid
from workbench.evidence.integral.responses import responses
from workbench.evidence.integral.stretching import Stretch, stretch_for

Array = npt.NDArray[np.float64]
Indices = npt.NDArray[np.intp]
Flags = npt.NDArray[np.bool_]

# One draw in nine, so that both kinds come in whole lattices of powers of 2.
PRIOR_SHARE = 1.0 / 9.0
_LN_2PI = float(np.log(2.0 * np.pi))


@dataclass(frozen=True, eq=False)
class Proposal:
    """The mixture on a grid's nodes.

    Attributes:
        grid: the nodes.
        whitening: (node, nuisance, nuisance) W with W'W = -Hessian, all in the axes of the bending.
        map: how whitened coordinates follow the bending.
        centres: (node, nuisance) maxima of the nuisance coordinates.
        responses: (node, signal, nuisance) change of that maximum with each signal coordinate.
        places: (node, signal) signal coordinates of the nodes: x for outer ones, standard for the inner one.
    """

    grid: Grid
    whitening: Array
    map: TriangularMap | RidgeMap
    centres: Array
    responses: Array
    places: Array

    @property
    def dimensions(self) -> int:
        """Return how many uniform numbers place a draw."""
        return len(self.grid.axes) + 1 + int(self.centres.shape[1])

    @property
    def lots(self) -> int:
        """Return how many uniform numbers choose between a draw's components."""
        return len(self.grid.axes) + 1

    @cached_property
    def prior_share(self) -> float:
        """Return the share of draws whose signal coordinates come from their prior; 0 without any."""
        return PRIOR_SHARE if self.places.shape[1] else 0.0

    @cached_property
    def _stretch(self) -> Stretch:
        return stretch_for(self.centres.shape[1])

    @cached_property
    def _ln_volume(self) -> Array:
        return np.asarray(np.linalg.slogdet(self.whitening)[1])

    @cached_property
    def _heights(self) -> Array:
        """Return (column, inner) heights relative to each column's largest."""
        columns = self.grid.columns
        return np.asarray(np.exp(columns.ln_height - columns.ln_height.max(axis=1, keepdims=True)))

    @cached_property
    def _field(self) -> Array:
        """Return (axis 1 node, ...) integrals over the inner coordinate, relative to the largest."""
        integrals = self.grid.columns.ln_integral()
        sizes = [axis.nodes.size for axis in self.grid.axes]
        return np.asarray(np.exp(integrals - integrals.max())).reshape(sizes)

    @cached_property
    def _steps(self) -> Array:
        """Return (column,) spacing of the inner nodes."""
        inner = self.grid.columns.inner
        return inner[:, 1] - inner[:, 0] if inner.shape[1] > 1 else np.ones(len(inner))

    @cached_property
    def _strides(self) -> Indices:
        sizes = [axis.nodes.size for axis in self.grid.axes]
        return np.array([int(np.prod(sizes[i + 1 :])) for i in range(len(sizes))], dtype=np.intp)

    def draw(self, cube: Array, from_prior: Flags) -> Array:
        """Return (draw, coordinate) points from (draw, dimension + lots) uniform numbers.

        Args:
            cube: positions and noise in the leading, evenest dimensions, choices between nodes last.
            from_prior: (draw,) True where the signal coordinates come from their prior.

        Returns:
            (draw, coordinate) standard coordinates.
        """
        grid, integrand = self.grid, self.grid.integrand
        outer, nuisance = len(grid.axes), integrand.nuisance.size
        position, noise, lots = np.split(cube, [outer + 1, outer + 1 + nuisance], axis=1)
        p, column = self._draw_outer(position[:, :outer], lots[:, 1:], from_prior)
        points = np.zeros((len(cube), integrand.model.size))
        points[:, list(integrand.outer)] = standard(p)
        node = column
        if integrand.inner is not None:
            t, place = self._draw_inner(column, position[:, outer], lots[:, 0], from_prior)
            points[:, integrand.inner] = t
            node = column * grid.columns.inner.shape[1] + place
        bent = self.map.forward(self._stretch.forward(special.ndtri(noise)))
        moved = unwhitened(self.whitening, node, bent)
        points[:, integrand.nuisance] = self._centre(node, self._signal(points)) + moved
        return points

    def ln_density(self, points: Array) -> Array:
        """Return the ln density of the mixture.

        Args:
            points: (draw, coordinate) standard coordinates.

        Returns:
            (draw,) ln density with respect to prior probability in the outer coordinates and to the standard
            coordinates in the rest [nats].
        """
        grid = self.grid
        p = special.ndtr(points[:, list(grid.integrand.outer)])
        beside = [between(axis.nodes, p[:, which]) for which, axis in enumerate(grid.axes)]
        norm = self._field
        for axis in reversed(grid.axes):
            norm = norm @ hat_areas(axis.nodes)
        signal = self._signal(points)
        nodes, shares = [], []
        for corner in product((0, 1), repeat=len(grid.axes)):
            column = np.zeros(len(points), dtype=np.intp)
            hat = np.ones(len(points))
            for side, (below, share), stride in zip(corner, beside, self._strides, strict=True):
                column += (below + side) * stride
                hat *= share if side else 1.0 - share
            for node, weight in self._corner(column, hat, hat * self._field.ravel()[column] / norm, points):
                nodes.append(node)
                shares.append(weight)
        beside_all = len(nodes)
        laws = self._normal(
            np.concatenate(nodes), np.tile(points, (beside_all, 1)), np.tile(signal, (beside_all, 1))
        )
        density = (np.concatenate(shares) * laws).reshape(beside_all, -1).sum(axis=0)
        return np.asarray(np.log(np.maximum(density, 1e-300)))

    def _draw_outer(self, cube: Array, lots: Array, from_prior: Flags) -> tuple[Array, Indices]:
        """Return (draw, outer) prior probabilities and the (draw,) column chosen beside them."""
        draws, axes = len(cube), self.grid.axes
        p = np.zeros((draws, len(axes)))
        column = np.zeros(draws, dtype=np.intp)
        rest: Array = self._field.reshape(1, -1)
        for which, axis in enumerate(axes):
            size = axis.nodes.size
            rest = rest.reshape(len(rest), size, -1)
            heights = rest @ _product_areas(axes[which + 1 :])
            if len(heights) == 1:  # the same for all draws
                heights = heights[0]
            padded = np.concatenate([heights[..., :1], heights, heights[..., -1:]], axis=-1)
            ends = np.concatenate([[0.0], axis.nodes, [1.0]])
            u = cube[:, which]
            p[:, which] = np.where(from_prior, u, draw(ends, padded, u))
            below, share = between(axis.nodes, p[:, which])
            place = below + _chosen(heights, below, share, lots[:, which], from_prior)
            column += place * self._strides[which]
            rest = rest[0, place] if len(rest) == 1 else rest[np.arange(draws), place]
        return p, column

    def _draw_inner(self, column: Indices, u: Array, lot: Array, from_prior: Flags) -> tuple[Array, Indices]:
        """Return (draw,) standard coordinates of the strength and the inner node chosen beside each."""
        inner, heights, step = (
            self.grid.columns.inner[column],
            self._heights[column],
            self._steps[column, None],
        )
        nodes = np.concatenate([inner[:, :1] - step, inner, inner[:, -1:] + step], axis=1)
        padded = np.pad(heights, ((0, 0), (1, 1)))
        t = np.where(from_prior, special.ndtri(u), draw(nodes, padded, u))
        below, share = between(inner, t)
        return t, below + _chosen(heights, below, share, lot, from_prior)

    def _signal(self, points: Array) -> Array:
        """Return (draw, signal) places in the proposal's own terms: x for outer coordinates."""
        integrand = self.grid.integrand
        places = np.zeros((len(points), self.places.shape[1]))
        for slot, index in enumerate(integrand.outer):
            places[:, slot] = integrand.model.coordinates[index].prior.from_standard(points[:, index])[0]
        if integrand.inner is not None:
            places[:, -1] = points[:, integrand.inner]
        return places

    def _centre(self, node: Indices, signal: Array) -> Array:
        """Return (draw, nuisance) maxima, followed from a node along their response for two inner steps."""
        if self.centres.shape[1] == 0:
            return self.centres[node]
        offset = signal - self.places[node]
        if self.grid.integrand.inner is not None:
            limit = 2.0 * self._steps[node // self.grid.columns.inner.shape[1]]
            offset[:, -1] = np.clip(offset[:, -1], -limit, limit)
        return self.centres[node] + (offset[:, None, :] @ self.responses[node])[:, 0]

    def _corner(
        self, column: Indices, hat: Array, outer_density: Array, points: Array
    ) -> list[tuple[Indices, Array]]:
        """Return the nodes of one neighbouring column beside each draw, with the (draw,) weight of each."""
        columns, index = self.grid.columns, self.grid.integrand.inner
        if index is None:
            return [(column, (1.0 - self.prior_share) * outer_density + self.prior_share * hat)]
        count = columns.inner.shape[1]
        t, inner, step = points[:, index], columns.inner[column], self._steps[column]
        area = self._heights.sum(axis=1)[column] * step
        below, share = between(inner, t)
        beyond = np.maximum(inner[:, 0] - t, t - inner[:, -1]) / step
        fade = np.clip(1.0 - beyond, 0.0, 1.0)
        prior = np.exp(-0.5 * t * t - 0.5 * _LN_2PI)
        found = []
        for side, near in ((0, 1.0 - share), (1, share)):
            place = below + side
            drawn = fade * self._heights[column, place] / area
            weight = near * (
                (1.0 - self.prior_share) * outer_density * drawn + self.prior_share * hat * prior
            )
            found.append((column * count + place, weight))
        return found

    def _normal(self, node: Indices, points: Array, signal: Array) -> Array:
        """Return (draw,) density of the nuisance coordinates under one node's pair of normal laws."""
        nuisance = self.grid.integrand.nuisance
        offset = points[:, nuisance] - self._centre(node, signal)
        normal, ln_stretch = self.map.inverse(grouped(self.whitening, node, offset))
        ln_law = self._stretch.ln_density(normal) + self._ln_volume[node] - ln_stretch
        return np.asarray(np.exp(ln_law))


def propose(grid: Grid) -> Proposal:
    """Return the proposal built on a grid's nodes."""
    integrand, columns = grid.integrand, grid.columns
    nuisance, model = integrand.nuisance, grid.integrand.model
    points = columns.points.reshape(-1, model.size)
    block = -columns.hessians.reshape(len(points), nuisance.size, nuisance.size)
    signal = [*integrand.outer, *([] if integrand.inner is None else [integrand.inner])]
    places = points[:, signal]
    for slot, index in enumerate(integrand.outer):
        places[:, slot] = model.coordinates[index].prior.from_standard(places[:, slot])[0]
    roots = upper_roots(block)
    bend = grid.bending
    if bend is None:
        straight = TriangularMap(np.zeros(3 * (nuisance.size,)))
        return Proposal(grid, roots, straight, points[:, nuisance], responses(grid), places)
    best = int(np.argmax(columns.ln_height))
    turn = np.linalg.solve(roots[best].T, bend.axes.T).T
    return Proposal(
        grid, turn @ roots, following(bend.third, bend.ridge), points[:, nuisance], responses(grid), places
    )


def _product_areas(axes: tuple[Axis, ...]) -> Array:
    areas = np.ones(1)
    for axis in axes:
        areas = np.outer(areas, hat_areas(axis.nodes)).ravel()
    return areas


def _chosen(heights: Array, below: Indices, share: Array, u: Array, from_prior: Flags) -> Indices:
    """Return 0 or 1: which of two neighbouring nodes a draw takes the rest from."""
    left = (1.0 - share) * np.where(from_prior, 1.0, taken(heights, below))
    right = share * np.where(from_prior, 1.0, taken(heights, below + 1))
    return np.asarray(u * (left + right) < right, dtype=np.intp)
