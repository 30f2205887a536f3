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
    last = nodes.shape[-1] - 2
    if nodes.ndim == 1:
        at_or_below = np.searchsorted(nodes, x, side="right")
    else:
        at_or_below = (nodes <= x[:, None]).sum(axis=1)
    below = np.clip(at_or_below - 1, 0, max(last, 0))
    if last < 0:
        return below, np.zeros(x.size)
    left, right = taken(nodes, below), taken(nodes, below + 1)
    return below, np.clip((x - left) / (right - left), 0.0, 1.0)


def taken(values: Array, places: Indices) -> Array:
    """Return one value a draw from (node,) or (draw, node) values."""
    return values[places] if values.ndim == 1 else values[np.arange(places.size), places]


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
    area = 0.5 * (heights[..., 1:] + heights[..., :-1]) * np.diff(nodes, axis=-1)
    upto = np.cumsum(area, axis=-1)
    target = u * upto[..., -1]
    if upto.ndim == 1:
        passed = np.searchsorted(upto, target, side="left")
    else:
        passed = (upto < target[:, None]).sum(axis=1)
    segment = np.minimum(passed, nodes.shape[-1] - 2)
    rest = target - np.where(segment > 0, taken(upto, np.maximum(segment - 1, 0)), 0.0)
    left = taken(nodes, segment)
    width = taken(nodes, segment + 1) - left
    f0, f1 = taken(heights, segment), taken(heights, segment + 1)
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
