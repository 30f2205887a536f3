"""Cells over which the updating ratio is added up: a prior's exact share of each, and R in its middle.

They stand close where R changes or the prior does.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from workbench.evidence.ratio.panels import Panels
from workbench.evidence.ratio.strengths import Strengths, between
from workbench.evidence.ratio.surface import Surface
from workbench.hypotheses.priors import Prior

Array = npt.NDArray[np.float64]

_TAIL = 1e-6
_STEPS = 2  # between strength nodes
_QUANTILES = 40  # of a strength's prior
_PANEL_CELLS = 18
_PRIOR_CELLS = 256
_COUNTS = 14.0  # nats below the largest that still count
_STEEP, _PEAK = 1.2, 3.0  # nats from cell to cell, no more than so many below the largest
_STEEP_AT_END, _END = 0.15, 7.0
_MORE = 97
_ROUNDS, _PARTS = 4, 4


def cells_of(surface: Surface, prior: Prior) -> tuple[Array, Array, Array]:
    """Return the cells that an average over the only parameter of a surface adds up.

    Args:
        surface: ln R over one parameter.
        prior: of it; not a fixed value, and not reaching outside its range.

    Returns:
        (cell + 1,) walls, (cell,) ln of R times the prior's probability, (cell,) the error of ln R [nats];
        empty cells left out.
    """
    strengths = surface.strengths
    if strengths is not None:
        walls, heights = (part[0] for part in strength_cells(surface, strengths, prior))
        place = strengths.place(0.5 * (walls[1:] + walls[:-1])[None])
        errors = between(surface.error, place, 2)[0]
    else:
        (panels,) = surface.panels
        walls, heights = panel_cells(panels, surface.ln_ratio[:, 0], prior)
        errors = linear(panels, surface.error[:, 0], 0.5 * (walls[1:] + walls[:-1]))
    is_there = np.diff(walls) > 0.0
    return np.append(walls[:-1][is_there], walls[-1]), heights[is_there], errors[is_there]


def strength_cells(surface: Surface, strengths: Strengths, prior: Prior) -> tuple[Array, Array]:
    """Return cells along the last strength, close where R counts.

    Args:
        surface: ln R.
        strengths: its strength nodes.
        prior: a prior that does not reach outside its range.

    Returns:
        (column, cell + 1) walls, and (column, cell) ln of R times the prior's probability in each cell.
    """
    low, high = _inside(prior.support, (strengths.low, strengths.high))
    quantiles = prior.quantile(_levels(_QUANTILES))
    walls = _sorted(strengths.refined(_STEPS), quantiles[None], low, high)
    heights = _heights(surface, strengths, prior, quantiles, walls)
    if _is_steep(heights):
        walls = _sorted(walls, _across_top(walls, heights), low, high)
        heights = _heights(surface, strengths, prior, quantiles, walls)
    return walls, heights


def panel_cells(panels: Panels, values: Array, prior: Prior) -> tuple[Array, Array]:
    """Return cells along one parameter, close where R or its prior changes.

    Args:
        panels: nodes along it.
        values: (node, ...) ln R [nats].
        prior: a prior that does not reach outside the panels.

    Returns:
        (cell + 1,) walls, and (cell, ...) ln of R times the prior's probability in each cell.
    """
    quantiles = prior.quantile(_levels(_PRIOR_CELLS + 1))
    walls = _walls(panels, prior, quantiles)
    heights = _heights_along(panels, values, prior, quantiles, walls)
    for _ in range(_ROUNDS):
        steep = _steep_cells(heights)
        if not steep.any():
            break
        cut = walls[:-1][steep][:, None] + np.diff(walls)[steep][:, None] * np.arange(1, _PARTS) / _PARTS
        walls = np.sort(np.concatenate([walls, cut.ravel()]))
        heights = _heights_along(panels, values, prior, quantiles, walls)
    return walls, heights


def linear(panels: Panels, errors: Array, x: Array) -> Array:
    """Return (point, ...) errors between nodes, linearly.

    Args:
        panels: nodes along one parameter.
        errors: (node, ...) errors at the nodes.
        x: (point,) values of the parameter.
    """
    nodes = panels.nodes
    below = np.clip(np.searchsorted(nodes, x, side="right") - 1, 0, len(nodes) - 2)
    share = np.clip((x - nodes[below]) / (nodes[below + 1] - nodes[below]), 0.0, 1.0)
    share = share.reshape(-1, *(1,) * (errors.ndim - 1))
    return np.asarray(errors[below] * (1.0 - share) + errors[below + 1] * share)


def _heights(surface: Surface, strengths: Strengths, prior: Prior, quantiles: Array, walls: Array) -> Array:
    """Return (column, cell) ln of R times the prior's probability in each cell."""
    place = strengths.place(0.5 * (walls[:, 1:] + walls[:, :-1]))
    return np.asarray(between(surface.ln_ratio, place, 4) + ln_masses(prior, quantiles, walls))


def _sorted(walls: Array, more: Array, low: float, high: float) -> Array:
    """Return (column, wall) ascending walls with more of them, from end to end of a range."""
    both = np.concatenate([walls, np.broadcast_to(more, (len(walls), more.shape[1]))], axis=1)
    found = np.sort(np.clip(both, low, high), axis=1)
    found[:, 0], found[:, -1] = low, high
    return np.asarray(found)


def _is_steep(heights: Array) -> bool:
    """Tell whether R changes too much from cell to cell where a column counts."""
    counts = heights.max(axis=1) > heights.max() - _COUNTS
    return bool(_steep(heights[counts].T).any())


def _steep(heights: Array) -> npt.NDArray[np.bool_]:
    """Return (cell - 1, ...) True where R changes too much from one cell to the next.

    Values in the middle of even cells add up to an integral that is wrong only by what happens at its ends:
    there the change has to be small, elsewhere only so that no peak falls between.
    """
    depth = heights.max(axis=0) - heights
    change = np.abs(np.diff(heights, axis=0))
    found = (change > _STEEP) & (np.minimum(depth[1:], depth[:-1]) < _PEAK)
    for end in (0, -1):
        found[end] |= (change[end] > _STEEP_AT_END) & (depth[end] < _END)
    return np.asarray(found)


def _across_top(walls: Array, heights: Array) -> Array:
    """Return (column, wall) evenly spaced walls across the cells that count in each column."""
    inside = heights > heights.max(axis=1, keepdims=True) - _COUNTS
    first, last = np.argmax(inside, axis=1), heights.shape[1] - np.argmax(inside[:, ::-1], axis=1)
    rows = np.arange(len(walls))
    ends = np.stack([walls[rows, first], walls[rows, last]], axis=1)
    return np.asarray(ends[:, :1] + (ends[:, 1:] - ends[:, :1]) * np.linspace(0.0, 1.0, _MORE))


def _inside(ends: tuple[float, float], limits: tuple[float, float]) -> tuple[float, float]:
    low, high = (min(max(end, limits[0]), limits[1]) for end in ends)
    return low, high


def ln_masses(prior: Prior, quantiles: Array, walls: Array) -> Array:
    """Return (column, cell) ln probabilities between walls, adding up to 1 in each column.

    Between neighbouring quantiles the probability is known; cells there share it by density times width.

    Args:
        prior: a prior.
        quantiles: (level,) values that the levels of `_levels` of it lie below.
        walls: (column, cell + 1) ascending, the quantiles among them.
    """
    width = np.diff(walls, axis=1)
    middle = 0.5 * (walls[:, 1:] + walls[:, :-1])
    with np.errstate(all="ignore"):
        share = np.where(width > 0.0, np.exp(prior.ln_density(middle)) * width, 0.0)
        known = np.diff(_levels(quantiles.size), prepend=0.0, append=1.0)
        group = np.searchsorted(quantiles, middle) + known.size * np.arange(len(walls))[:, None]
        whole = np.bincount(group.ravel(), share.ravel(), minlength=known.size * len(walls))
        mass = share * (np.tile(known, len(walls)) / whole)[group]
        mass = np.nan_to_num(mass, nan=0.0, posinf=0.0)
        return np.asarray(np.log(np.maximum(mass / mass.sum(axis=1, keepdims=True), 1e-300)))


def _levels(number: int) -> Array:
    """Return (level,) probabilities, evenly spaced but for a millionth at both ends."""
    return np.linspace(_TAIL, 1.0 - _TAIL, number)


def _heights_along(panels: Panels, values: Array, prior: Prior, quantiles: Array, walls: Array) -> Array:
    """Return (cell, ...) ln of R times the prior's probability in each cell."""
    masses = ln_masses(prior, quantiles, walls[None])[0]
    x = 0.5 * (walls[1:] + walls[:-1])
    return np.asarray(panels.between(values, x) + masses.reshape(-1, *(1,) * (values.ndim - 1)))


def _steep_cells(heights: Array) -> npt.NDArray[np.bool_]:
    """Return (cell,) True where R changes too much from cell to cell, for what counts."""
    either = _steep(heights.reshape(len(heights), -1)).any(axis=1)
    beside: npt.NDArray[np.bool_] = np.concatenate([either, [False]]) | np.concatenate([[False], either])
    return beside


def _walls(panels: Panels, prior: Prior, quantiles: Array) -> Array:
    """Return (cell + 1,) ascending walls: close in every panel, and over the prior."""
    low, high = _inside(prior.support, panels.range)
    steps = np.arange(_PANEL_CELLS) / _PANEL_CELLS
    inside = (panels.edges[:-1, None] + np.diff(panels.edges)[:, None] * steps).ravel()
    found = np.unique(np.concatenate([inside, quantiles]))
    return np.concatenate([[low], found[(found > low) & (found < high)], [high]])
