"""Piecewise-linear densities on nodes: where a value stands between them, and drawing from them."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]
Indices = npt.NDArray[np.intp]


def between(nodes: Array, x: Array) -> tuple[Indices, Array]:
    """Return where values stand between nodes.

    Args:
        nodes: (node,) or (draw, node) ascending positions.
        x: (draw,) values.

    Returns:
        The index of the node at or below each value and the share of the next one, in [0, 1]; outside the
        nodes the nearest one has all.
    """
    rows = np.broadcast_to(nodes, (x.size, nodes.shape[-1]))
    last = nodes.shape[-1] - 2
    below = np.clip((rows <= x[:, None]).sum(axis=1) - 1, 0, max(last, 0))
    if last < 0:
        return below, np.zeros(x.size)
    left = np.take_along_axis(rows, below[:, None], 1)[:, 0]
    right = np.take_along_axis(rows, below[:, None] + 1, 1)[:, 0]
    return below, np.clip((x - left) / (right - left), 0.0, 1.0)


def hat_areas(nodes: Array) -> Array:
    """Return (node,) areas of the hat functions of nodes inside (0, 1), the end ones flat to 0 and 1."""
    padded = np.concatenate([[-nodes[0]], nodes, [2.0 - nodes[-1]]])
    return np.asarray(0.5 * (padded[2:] - padded[:-2]))


def draw(nodes: Array, heights: Array, u: Array) -> Array:
    """Return draws from the density that is linear between nodes.

    Args:
        nodes: (node,) or (draw, node) ascending positions.
        heights: (node,) or (draw, node) density at the nodes, in any unit; >= 0.
        u: (draw,) uniform numbers in (0, 1).

    Returns:
        (draw,) positions whose distribution function equals u.
    """
    shape = (u.size, nodes.shape[-1])
    x, f = np.broadcast_to(nodes, shape), np.broadcast_to(heights, shape)
    area = 0.5 * (f[:, 1:] + f[:, :-1]) * np.diff(x, axis=1)
    upto = np.cumsum(area, axis=1)
    target = u * upto[:, -1]
    segment = np.minimum((upto < target[:, None]).sum(axis=1), shape[1] - 2)
    row = np.arange(u.size)
    rest = target - np.where(segment > 0, upto[row, np.maximum(segment - 1, 0)], 0.0)
    left, width = x[row, segment], x[row, segment + 1] - x[row, segment]
    f0, f1 = f[row, segment], f[row, segment + 1]
    root = np.sqrt(np.maximum(f0 * f0 + 2.0 * rest * (f1 - f0) / width, 0.0))
    return np.asarray(left + np.clip(2.0 * rest / np.maximum(f0 + root, 1e-300), 0.0, width))


def distribution(nodes: Array, heights: Array, x: Array) -> tuple[Array, Array]:
    """Return distribution function and density of the density that is linear between nodes.

    Args:
        nodes: (node,) ascending positions.
        heights: (node,) density at the nodes, in any unit; >= 0.
        x: (draw,) positions.

    Returns:
        (draw,) distribution function in [0, 1] and (draw,) normalised density; 0 outside the nodes.
    """
    area = 0.5 * (heights[1:] + heights[:-1]) * np.diff(nodes)
    upto = np.concatenate([[0.0], np.cumsum(area)])
    below, share = between(nodes, x)
    left, right = heights[below], heights[below + 1]
    density = left + share * (right - left)
    width = nodes[below + 1] - nodes[below]
    within = share * width * 0.5 * (left + density)
    inside = (x >= nodes[0]) & (x <= nodes[-1])
    return (upto[below] + within) / upto[-1], np.where(inside, density, 0.0) / upto[-1]
