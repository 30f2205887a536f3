"""The full surface of the updating ratio: nodes laid out, worked out, and laid closer where it is rough."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from workbench.evidence.integral.axes import lay_out
from workbench.evidence.ratio.held import FAILED, Held, Holder, Response
from workbench.evidence.ratio.panels import ORDER, Panels
from workbench.evidence.ratio.strengths import Strengths, between, doubt_between
from workbench.evidence.ratio.surface import Surface, product

Array = npt.NDArray[np.float64]
Flags = npt.NDArray[np.bool_]
Indices = npt.NDArray[np.intp]

_DEPTH = 8.0  # nats below a column's top where what lies between nodes matters
_DRAWN_DEPTH = 10.0
_LEAST_ERROR = 3e-4  # nats, of maxima that are found to a tolerance
_ROUGH = 0.005  # nats that may be left out between nodes near the tops of columns
_ROUNDS = 5
MOST_COLUMNS = 2500
_FEWEST, _MOST_NODES = 19, 49
_CORE_STEP, _FINE_STEP, _FEW_COLUMNS = 0.2, 0.12, 60
_RELAID = 4
_FINE = 16
_MOST_DRAWS = 3e7  # bins x draws x nodes


@dataclass(frozen=True, slots=True, eq=False)
class Standing:
    """Columns that are worked out.

    Attributes:
        outer: (column, outer) parameter values.
        strengths: their strength nodes; None without a strength.
        held: marginal likelihoods, column after column.
    """

    outer: Array
    strengths: Strengths | None
    held: Held

    @property
    def each(self) -> int:
        """Return the nodes in a column."""
        return 1 if self.strengths is None else self.strengths.number

    def take(self, rows: Indices) -> Standing:
        """Return some columns."""
        nodes = (rows[:, None] * self.each + np.arange(self.each)).ravel()
        strengths = None if self.strengths is None else self.strengths.take(rows)
        return Standing(self.outer[rows], strengths, self.held.take(nodes))

    def joined(self, other: Standing) -> Standing:
        """Return these columns and others."""
        strengths = self.strengths
        if strengths is not None and other.strengths is not None:
            strengths = strengths.joined(other.strengths)
        return Standing(np.concatenate([self.outer, other.outer]), strengths, self.held.joined(other.held))

    def by_column(self, values: Array) -> Array:
        """Return (column, node) of (point,) values."""
        return values.reshape(len(self.outer), self.each)


def build(
    holder: Holder, panels: tuple[Panels, ...], strength: Strengths | None, reference: Held | None
) -> tuple[Surface, Standing]:
    """Return the full surface.

    Args:
        holder: the hypothesis with its signal parameters held.
        panels: what to start from along every parameter but the last strength.
        strength: name, ends and nothing else of the last strength; None without one.
        reference: the point that R is 1 at; None takes the best node.

    Returns:
        The surface, relative to the reference, and what it was made of.
    """
    standing = worked_out(holder, strength, product([one.nodes for one in panels]))
    for _ in range(_ROUNDS):
        finer = _refined(panels, _surface(panels, standing, reference))
        if finer is None:
            break
        standing = _extended(holder, panels, standing, finer)
        panels = finer
    surface = _surface(panels, standing, reference)
    doubts = sum((_roughness(surface, axis)[1] ** 2 for axis in range(len(panels))), surface.error**2)
    return replace(surface, error=np.sqrt(doubts + _LEAST_ERROR**2)), standing


def first_panels(holder: Holder) -> tuple[Panels, ...]:
    """Return panels of equal angle between neighbouring signals, along all but the last strength."""
    outer = holder.integrand.outer
    found = []
    for index in outer:
        coordinate = holder.model.coordinates[index]
        low, high = coordinate.prior.support
        axis = lay_out(holder.model, holder.landscape, index, outer)
        found.append(Panels(coordinate.name, coordinate.unit, low + (high - low) * axis.edges))
    return tuple(found)


def worked_out(holder: Holder, strength: Strengths | None, outer: Array) -> Standing:
    """Return columns at the given values of the other signal parameters, their strengths where R lives."""
    if strength is None:
        held = holder.at(outer, np.zeros((len(outer), 1)), lambda ln_laplace: ln_laplace > FAILED)
        return Standing(outer, None, held)
    reach = max(abs(strength.low), abs(strength.high))
    response = holder.response(outer, reach)
    absorbed = response.absorbed
    standing = _strung(holder, _laid(strength, response), outer, absorbed)
    for _ in range(_RELAID):
        if standing.strengths is None:
            break
        rows, better = _better(standing, standing.strengths)
        if rows.size == 0:
            break
        order = np.arange(len(outer))
        order[rows] = len(outer) + np.arange(rows.size)
        again = _strung(holder, better, outer[rows], absorbed[rows])
        standing = standing.joined(again).take(order)
    return standing


def _laid(strength: Strengths, response: Response) -> Strengths:
    """Return strength nodes as the linear response of the counts suggests them."""
    length = strength.high - strength.low
    events = np.maximum(response.events, 1e-9 / length)
    offset = np.minimum(response.worth, 1e6 * length) - min(strength.low, 0.0)
    scale = np.minimum(1.5 / np.sqrt(events), 10.0 * np.sqrt(strength.high + offset))
    centre = np.clip(response.best, strength.low, strength.high)
    laid = replace(strength, offset=offset, centre=centre, scale=scale)
    if strength.number:
        return laid
    step = _CORE_STEP if len(offset) > _FEW_COLUMNS else _FINE_STEP
    wanted = int(np.ceil(float(laid.graded[1].max()) / step)) + 1
    return replace(laid, number=int(np.clip(wanted, _FEWEST, _MOST_NODES)))


def _strung(holder: Holder, laid: Strengths, outer: Array, absorbed: Array) -> Standing:
    """Return columns worked out at laid-out strengths."""
    strengths = laid.nodes
    count, each = strengths.shape
    values = np.concatenate([np.repeat(outer, each, axis=0), strengths.reshape(-1, 1)], axis=1)
    moved = (strengths[:, :, None] * absorbed[:, None, :]).reshape(count * each, -1)
    draws = len(holder.draws.whitened)
    stride = int(np.clip(np.ceil(count * each * draws * holder.model.bins / _MOST_DRAWS), 1, 6))

    def is_worth(ln_laplace: Array) -> Flags:
        columns = ln_laplace.reshape(count, each)
        near = columns > columns[:, :1] - _DRAWN_DEPTH  # the first is background only, or next to it
        near |= columns > columns.max(axis=1, keepdims=True) - _DRAWN_DEPTH
        return np.asarray((near & (np.arange(each) % stride == 0)).ravel())

    held = holder.at(values, moved, is_worth)
    return Standing(outer, laid, replace(held, corrections=_filled(held, count, each)))


def _filled(held: Held, count: int, each: int) -> Array:
    """Return (point, scramble) corrections, nodes without draws taking those of their neighbours."""
    corrections = held.corrections.reshape(count, each, -1)
    drawn = (corrections != 1.0).any(axis=2)
    filled = corrections.copy()
    places = np.arange(each)
    for column in np.flatnonzero(drawn.any(axis=1) & ~drawn.all(axis=1)):
        known = places[drawn[column]]
        for scramble in range(corrections.shape[2]):
            filled[column, :, scramble] = np.interp(places, known, corrections[column, known, scramble])
    return filled.reshape(count * each, -1)


def _better(standing: Standing, strengths: Strengths) -> tuple[Indices, Strengths]:
    """Return which columns are read poorly between their nodes, and nodes laid out by what they show."""
    values = standing.by_column(standing.held.ln_evidence)
    depth = values.max(axis=1, keepdims=True) - values
    poor = (np.where(depth < _DEPTH, doubt_between(values), 0.0)).max(axis=1) > _ROUGH
    rows = np.flatnonzero(poor & (values.max(axis=1) > FAILED))
    chosen, values = strengths.take(rows), values[rows]
    if rows.size == 0:
        return rows, chosen
    fine = chosen.refined(_FINE)
    read = between(values, chosen.place(fine))
    y = np.sqrt(np.maximum(fine + chosen.offset[:, None], 0.0))
    top = np.argmax(read, axis=1)[:, None]
    away = np.abs(y - np.take_along_axis(y, top, 1))
    fallen = np.where(read < read.max(axis=1, keepdims=True) - 2.0, away, np.inf)
    width = fallen.min(axis=1)
    scale = np.where(np.isfinite(width), 1.5 * width, chosen.scale)
    centre = np.take_along_axis(fine, top, 1)[:, 0]
    return rows, replace(chosen, centre=centre, scale=np.minimum(scale, 0.7 * chosen.scale), known=None)


def _surface(panels: tuple[Panels, ...], standing: Standing, reference: Held | None) -> Surface:
    held = standing.held
    if reference is None:
        reference = held.take(np.array([int(np.argmax(held.ln_evidence))]))
    ln_ratio, error = (standing.by_column(one) for one in held.ln_ratio(reference))
    if standing.strengths is not None:
        error = np.hypot(error, doubt_between(ln_ratio))
    return Surface(panels, standing.strengths, ln_ratio, error)


def _refined(panels: tuple[Panels, ...], surface: Surface) -> tuple[Panels, ...] | None:
    """Return panels with the rough ones cut in half; None where all are smooth or there are enough."""
    finer = list(panels)
    for axis, one in enumerate(panels):
        size = _roughness(surface, axis)[0]
        rough = np.flatnonzero(size > _ROUGH)
        others = float(np.prod([float(two.nodes.size) for k, two in enumerate(finer) if k != axis]))
        room = int((MOST_COLUMNS / others - one.nodes.size) // ORDER)
        chosen = rough[np.argsort(-size[rough])][: max(room, 0)]
        finer[axis] = one.split(np.sort(chosen)) if chosen.size else one
    grown = any(new is not old for new, old in zip(finer, panels, strict=True))
    return tuple(finer) if grown else None


def _roughness(surface: Surface, axis: int) -> tuple[Array, Array]:
    """Return how much is left out between nodes along one parameter.

    Returns:
        (panel,) the largest near the tops of its columns, and (column, node) what to expect at each node
        [nats].
    """
    panels = surface.panels[axis]
    index = np.moveaxis(np.arange(len(surface.outer)).reshape(surface.shape), axis, 0)
    columns = panels.by_panel(index.reshape(panels.nodes.size, -1))  # (panel, 7, other)
    count, each, other = columns.shape
    middle = columns[:, each // 2]
    strengths = surface.strengths
    if strengths is None:
        read, nodes = surface.ln_ratio[columns], np.zeros((count, other, 1))
    else:
        nodes = strengths.nodes[middle]
        wanted = np.repeat(nodes[:, None], each, axis=1).reshape(count * each * other, -1)
        flat = columns.ravel()
        read = between(surface.ln_ratio[flat], strengths.take(flat).place(wanted))
        read = read.reshape(count, each, other, -1)
    left_out = panels.left_out(read)  # (panel, other, node)
    near = read.max(axis=1) > surface.ln_ratio[middle].max(axis=2, keepdims=True) - _DEPTH
    worst = np.where(near, left_out, 0.0).max(axis=(1, 2))
    return worst, _spread(surface, columns, nodes, left_out)


def _spread(surface: Surface, columns: Indices, nodes: Array, left_out: Array) -> Array:
    """Return (column, node) what is left out, the larger where two panels share a node."""
    found = np.zeros_like(surface.ln_ratio)
    own = None if surface.strengths is None else surface.strengths.nodes
    for panel, group in enumerate(columns):
        for place in range(group.shape[1]):
            for column in group[:, place]:
                if own is None:
                    size = left_out[panel, place]
                else:
                    size = np.interp(own[column], nodes[panel, place], left_out[panel, place])
                found[column] = np.maximum(found[column], size)
    return found


def _extended(
    holder: Holder, panels: tuple[Panels, ...], standing: Standing, finer: tuple[Panels, ...]
) -> Standing:
    """Return columns on finer panels, those that stand taken over."""
    old = {tuple(row): index for index, row in enumerate(product([one.nodes for one in panels]))}
    wanted = product([one.nodes for one in finer])
    order = np.array([old.get(tuple(row), -1) for row in wanted])
    new = np.flatnonzero(order < 0)
    order[new] = len(standing.outer) + np.arange(new.size)
    return standing.joined(worked_out(holder, standing.strengths, wanted[new])).take(order)
