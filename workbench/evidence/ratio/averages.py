"""The updating ratio averaged over priors: over some of its parameters, or over all, which is a Bayes factor.

Cells between which a prior's probability is exact stand where R changes or the prior does; R counts with its
value in the middle of each.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.evidence.ratio.cells import linear, panel_cells, strength_cells
from workbench.evidence.ratio.panels import Panels
from workbench.evidence.ratio.strengths import Strengths, between
from workbench.evidence.ratio.surface import Surface
from workbench.hypotheses.priors import Fixed, Prior

Array = npt.NDArray[np.float64]

OUTSIDE = 1e-4  # of a prior's probability may lie outside a range
_KEPT_NODES = 61


def outside(prior: Prior, low: float, high: float) -> float:
    """Return the probability of a prior outside a range.

    Args:
        prior: a prior.
        low: lower end of the range.
        high: upper end.
    """
    if isinstance(prior, Fixed):
        return float(not low <= prior.value <= high)
    t = prior.to_standard(np.array([low, high]))
    return float(special.ndtr(t[0]) + special.ndtr(-t[1]))


def averaged_over_strength(surface: Surface, strengths: Strengths, prior: Prior) -> tuple[Array, Array]:
    """Return (column,) ln of R averaged over the last strength, and its error [nats].

    Args:
        surface: ln R.
        strengths: its strength nodes.
        prior: a prior that does not reach outside its range.
    """
    if isinstance(prior, Fixed):
        place = strengths.place(np.full((len(surface.ln_ratio), 1), prior.value))
        return between(surface.ln_ratio, place)[:, 0], between(surface.error, place, 2)[:, 0]
    walls, heights = strength_cells(surface, strengths, prior)
    top = heights.max(axis=1, keepdims=True)
    weights = np.exp(heights - top)
    total = weights.sum(axis=1)
    place = strengths.place(0.5 * (walls[:, 1:] + walls[:, :-1]))
    errors = (weights * between(surface.error, place, 2)).sum(axis=1) / total
    return top[:, 0] + np.log(total), errors


def averaged_along(panels: Panels, values: Array, errors: Array, prior: Prior) -> tuple[Array, Array]:
    """Return ln R averaged over one parameter, and its error.

    Args:
        panels: nodes along it.
        values: (node, ...) ln R [nats].
        errors: (node, ...) its error [nats].
        prior: a prior that does not reach outside the panels.

    Returns:
        (...) ln of the average, and its error [nats].
    """
    if isinstance(prior, Fixed):
        x = np.array([prior.value])
        return panels.between(values, x)[0], linear(panels, errors, x)[0]
    walls, heights = panel_cells(panels, values, prior)
    top = heights.max(axis=0)
    weights = np.exp(heights - top)
    total = weights.sum(axis=0)
    x = 0.5 * (walls[1:] + walls[:-1])
    return top + np.log(total), (weights * linear(panels, errors, x)).sum(axis=0) / total


def averaged(surface: Surface, priors: dict[str, Prior]) -> Surface:
    """Return the surface over the parameters without a prior, averaged over those with one.

    Args:
        surface: ln R over its parameters.
        priors: by parameter, for those to average over.

    Returns:
        A surface over the others; without any parameters left its single node is ln B.

    Source:
        None, definition: the average of R over a prior.
    """
    strengths = surface.strengths
    if strengths is not None and strengths.name in priors:
        values, errors = averaged_over_strength(surface, strengths, priors[strengths.name])
        surface = Surface(surface.panels, None, values[:, None], errors[:, None])
    elif strengths is not None and any(one.name in priors for one in surface.panels):
        surface = aligned(surface, strengths, [one.name in priors for one in surface.panels])
    values, errors = (one.reshape(*surface.shape, -1) for one in (surface.ln_ratio, surface.error))
    kept = surface.panels
    for one in surface.panels:
        axis = kept.index(one)
        if one.name in priors:
            values, errors = np.moveaxis(values, axis, 0), np.moveaxis(errors, axis, 0)
            values, errors = averaged_along(one, values, errors, priors[one.name])
            kept = (*kept[:axis], *kept[axis + 1 :])
    rows = int(np.prod([one.nodes.size for one in kept]))
    left = surface.strengths
    if left is not None and len(left.offset) != rows:
        left = left.take(np.unique(_groups(surface, kept), return_index=True)[1])
    return Surface(kept, left, values.reshape(rows, -1), errors.reshape(rows, -1))


def _groups(surface: Surface, kept: tuple[Panels, ...]) -> npt.NDArray[np.intp]:
    """Return (column,) index of each column among the columns of the kept panels."""
    index = np.indices(surface.shape).reshape(len(surface.shape), -1)
    found = np.zeros(index.shape[1], dtype=np.intp)
    for axis, one in enumerate(surface.panels):
        if one in kept:
            found = found * one.nodes.size + index[axis]
    return found


def aligned(surface: Surface, strengths: Strengths, is_averaged: list[bool]) -> Surface:
    """Return the surface with the same strength nodes in all columns that are averaged with each other.

    Args:
        surface: ln R.
        strengths: its strength nodes; returned as it is where these are the same in all columns already.
        is_averaged: of each of the panels, True where it is going to be averaged over.
    """
    if _are_alike(strengths):
        return surface
    kept = tuple(one for one, gone in zip(surface.panels, is_averaged, strict=True) if not gone)
    groups = _groups(surface, kept)
    tops = surface.ln_ratio.max(axis=1)
    order = np.lexsort((-tops, groups))
    best = order[np.unique(groups[order], return_index=True)[1]]
    few: Strengths = replace(strengths.take(best), number=_KEPT_NODES, known=None)
    common = replace(few, known=few.nodes).take(groups)
    place = strengths.place(common.nodes)
    values, errors = between(surface.ln_ratio, place), between(surface.error, place, 2)
    return Surface(surface.panels, common, values, errors)


def _are_alike(strengths: Strengths) -> bool:
    """Tell whether all columns have the same nodes."""
    return all(bool((one == one[0]).all()) for one in (strengths.offset, strengths.centre, strengths.scale))
