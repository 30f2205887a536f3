"""What the nuisance coordinates' departure from a Gaussian adds to Laplace, with its doubt.

It is found at the best node. Where it has to be followed along a ridge it may differ from strength to
strength, so that it is then found at several nodes of the best column and averaged over them.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from workbench.evidence.integral.bending import Bending, bending, partial_bending
from workbench.evidence.integral.nodes import Columns, Integrand
from workbench.evidence.integral.ridge import Turned, follow

Array = npt.NDArray[np.float64]

_EVERY = 2
_SHARE = 0.01
_MOST_WITH_HESSIANS = 40


@dataclass(frozen=True, slots=True, eq=False)
class Departure:
    """How far an integrand's nuisance coordinates are from a Gaussian.

    Attributes:
        bending: that at the best node; None without nuisance coordinates, or where there is no maximum.
        ln_correction: what it adds to Laplace's ln integral [nats].
        doubt: how far that may be off [nats].
    """

    bending: Bending | None
    ln_correction: float = 0.0
    doubt: float = 0.0


def departure(integrand: Integrand, columns: Columns, along_ridge: bool) -> Departure:
    """Return what Laplace's next orders add at the nodes that carry the evidence.

    Args:
        integrand: what is integrated.
        columns: its nodes.
        along_ridge: True follows the most bent direction node by node whatever it is like.

    Returns:
        The bending at the best node, the ln correction and its doubt.
    """
    column, inner = np.unravel_index(int(np.argmax(columns.ln_height)), columns.ln_height.shape)
    best = _bending(integrand, columns, int(column), int(inner), along_ridge)
    if best is None:
        return Departure(None)
    if best.ridge is None or not columns.has_inner:
        return Departure(best, best.ln_correction, best.doubt)
    heights = np.exp(columns.ln_height[column] - columns.ln_height[column, inner])
    share = heights / heights.sum()
    chosen = [k for k in range(len(share)) if share[k] > _SHARE and (k - inner) % _EVERY == 0]
    found = [(k, best if k == inner else _bending(integrand, columns, int(column), k, True)) for k in chosen]
    known = [(k, bend) for k, bend in found if bend is not None]
    places = np.array([columns.inner[column, k] for k, _ in known])
    order = np.interp(columns.inner[column], places, [bend.ln_correction for _, bend in known])
    doubt = np.interp(columns.inner[column], places, [bend.doubt for _, bend in known])
    return Departure(best, float(np.log((share * np.exp(order)).sum())), float((share * doubt).sum()))


def _bending(
    integrand: Integrand, columns: Columns, column: int, inner: int, along_ridge: bool
) -> Bending | None:
    """Return the departure at one node, with its ridge where third derivatives do not describe it."""
    nuisance = integrand.nuisance
    if nuisance.size == 0:
        return None
    centre = columns.points[column, inner]
    block = np.ix_(nuisance, nuisance)
    objective = integrand.objective

    def placed(offsets: Array) -> Array:
        points = np.repeat(centre[None], len(offsets), axis=0)
        points[:, nuisance] += offsets
        return points

    def hessians_at(offsets: Array) -> Array:
        return objective.derivatives(placed(offsets), integrand.counts)[2][:, block[0], block[1]]

    def gradients_at(offsets: Array) -> Array:
        return objective.gradient(placed(offsets), integrand.counts)[:, nuisance]

    hessian = columns.hessians[column, inner]
    if np.linalg.eigvalsh(-hessian).min() <= 0.0:
        return None
    if nuisance.size > _MOST_WITH_HESSIANS:
        return partial_bending(gradients_at, hessian)
    bend = bending(hessians_at, hessian)
    if not (along_ridge or bend.is_beyond_third_order):
        return bend
    bend = bend.led_by(bend.bent_most)
    turned = Turned(objective, centre, nuisance, bend.outward)
    return replace(bend, ridge=follow(turned, integrand.counts, bend.third[1:, 0, 0]))
