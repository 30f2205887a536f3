"""The evidence by quadrature over signal coordinates, with Laplace for the rest."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from workbench.evidence.integral.axes import Axis, lay_out, standard
from workbench.evidence.integral.bending import Bending
from workbench.evidence.integral.departure import Departure, departure
from workbench.evidence.integral.nodes import Columns, Integrand
from workbench.evidence.integral.search import survey
from workbench.likelihood.model import Model

Array = npt.NDArray[np.float64]

_NOWHERE: Mapping[str, float] = {}
_ROUNDS = 12
_MOST_COLUMNS = 6000


@dataclass(frozen=True, slots=True, eq=False)
class Grid:
    """Nodes over the signal coordinates with their integral.

    Attributes:
        integrand: what was integrated.
        axes: one axis for each outer coordinate.
        columns: nodes in the order of the axes' product, the last axis running fastest.
        ln_evidence: ln of the integral [nats].
        error: estimated error of the quadrature and of Laplace [nats].
        departure: departure from the Gaussian, whose ln correction ln_evidence includes.
    """

    integrand: Integrand
    axes: tuple[Axis, ...]
    columns: Columns
    ln_evidence: float
    error: float
    departure: Departure

    @property
    def bending(self) -> Bending | None:
        """Return the departure from the Gaussian at the best node; None without any."""
        return self.departure.bending

    @property
    def mode(self) -> dict[str, float]:
        """Return the standard coordinates of the best node by name, signal coordinates left out."""
        best = np.unravel_index(int(np.argmax(self.columns.ln_height)), self.columns.ln_height.shape)
        model = self.integrand.model
        return {
            model.names[index]: float(self.columns.points[best][index]) for index in self.integrand.nuisance
        }

    @property
    def evaluations(self) -> int:
        """Return the number of nodes."""
        return int(self.columns.inner.size)


@np.errstate(all="ignore")  # an impossible point has ln probability -inf, and a step to it is shortened
def integrate(
    model: Model, counts: Array, near: Mapping[str, float] = _NOWHERE, *, along_ridge: bool = False
) -> Grid | None:
    """Return the quadrature of a hypothesis' evidence with its nodes.

    Peaks are located first: panels follow the angle between neighbouring signals, so that no resolution
    element is without two nodes, and panels are cut in half where the seven-point and the three-point rule
    differ.

    Args:
        model: a hypothesis.
        counts: (bin,) observed counts [events].
        near: standard coordinates by name to start from, such as another hypothesis' mode.
        along_ridge: True follows the most bent nuisance direction node by node whatever it is like.

    Returns:
        The grid of nodes with ln evidence and error; None where it would take more nodes than can be held, or
        where the numbers are too far apart for double precision.

    Limits:
        Nuisance coordinates far from Gaussian: the error says so, and the sampling pass corrects it.
    """
    try:
        return _integrated(model, counts, near, along_ridge)
    except np.linalg.LinAlgError:
        return None


def _integrated(model: Model, counts: Array, near: Mapping[str, float], along_ridge: bool) -> Grid | None:
    landscape = survey(model, counts, near)
    integrand = Integrand(model, counts, landscape)
    outer = integrand.outer
    axes = tuple(lay_out(model, landscape, axis, outer) for axis in outer)
    if np.prod([float(axis.nodes.size) for axis in axes]) > _MOST_COLUMNS:
        return None
    columns = integrand.columns(_product([axis.nodes for axis in axes]))
    for _ in range(_ROUNDS):
        finer = _refined(axes, columns)
        if finer is None or integrand.is_beyond_reach(columns):
            break
        columns = _extended(integrand, axes, columns, finer)
        axes = finer
    return _summed(integrand, axes, columns, departure(integrand, columns, along_ridge))


@np.errstate(all="ignore")
def integrate_again(model: Model, grid: Grid) -> Grid:
    """Return the quadrature under another prior of a strength, on the axes of a quadrature that stands.

    Args:
        model: the hypothesis of the grid, the prior of a strength changed.
        grid: its quadrature, whose departure is kept, so that it cancels in the change.

    Returns:
        The grid with new columns.
    """
    integrand = replace(grid.integrand, model=model)
    columns = integrand.columns(_product([axis.nodes for axis in grid.axes]))
    return _summed(integrand, grid.axes, columns, grid.departure)


def _product(nodes: list[Array]) -> Array:
    """Return (column, outer) standard coordinates of the product of the axes' nodes."""
    if not nodes:
        return np.zeros((1, 0))
    mesh = np.meshgrid(*nodes, indexing="ij")
    return standard(np.stack([part.ravel() for part in mesh], axis=1))


def _field(axes: tuple[Axis, ...], columns: Columns) -> tuple[float, Array]:
    """Return the largest ln column integral and (axis 1 node, axis 2 node, ...) integrals relative to it."""
    heights = columns.ln_integral()
    top = float(heights.max())
    shape = tuple(axis.nodes.size for axis in axes)
    return top, np.exp(heights - top).reshape(shape)


def _contract(field: Array, weights: list[Array]) -> Array:
    for weight in reversed(weights):
        field = field @ weight
    return field


def _panel_errors(axes: tuple[Axis, ...], field: Array, which: int) -> Array:
    """Return (panel,) differences between the two rules along one axis, all other axes summed."""
    moved = np.moveaxis(field, which, 0)
    others = [axis.weights for index, axis in enumerate(axes) if index != which]
    profile = _contract(moved, others)
    difference = (axes[which].weights - axes[which].coarse_weights) * profile
    return np.asarray(np.abs(difference.reshape(-1, 7).sum(axis=1)))


def _refined(axes: tuple[Axis, ...], columns: Columns) -> tuple[Axis, ...] | None:
    """Return axes with their worst panels cut, or None when the sum is good enough."""
    if not axes:
        return None
    _, field = _field(axes, columns)
    total = float(_contract(field, [axis.weights for axis in axes]))
    finer, grown = [], False
    for which, axis in enumerate(axes):
        errors = _panel_errors(axes, field, which) / total
        # The seven-point rule is far better than its difference to the three-point one.
        bad = np.flatnonzero(errors > 0.02)
        if bad.size and np.diff(axis.edges)[bad].min() > 1e-9:
            finer.append(axis.split(bad))
            grown = True
        else:
            finer.append(axis)
    if not grown or np.prod([axis.nodes.size for axis in finer]) > _MOST_COLUMNS:
        return None
    return tuple(finer)


def _extended(
    integrand: Integrand, axes: tuple[Axis, ...], columns: Columns, finer: tuple[Axis, ...]
) -> Columns:
    """Return columns on finer axes, those that stand already taken over."""
    old = {tuple(row): index for index, row in enumerate(_product([axis.nodes for axis in axes]))}
    wanted = _product([axis.nodes for axis in finer])
    order = np.full(len(wanted), -1)
    for index, row in enumerate(wanted):
        order[index] = old.get(tuple(row), -1)
    new = np.flatnonzero(order < 0)
    order[new] = len(columns.outer) + np.arange(new.size)
    return columns.joined(integrand.columns(wanted[new])).take(order)


def _summed(integrand: Integrand, axes: tuple[Axis, ...], columns: Columns, departed: Departure) -> Grid:
    top, field = _field(axes, columns)
    total = float(_contract(field, [axis.weights for axis in axes]))
    share = field / field.sum()
    outer_error = sum(
        float(np.minimum(200.0 * e**1.5, e).sum())
        for e in (_panel_errors(axes, field, which) / total for which in range(len(axes)))
    )
    inner_error = float((share.ravel() * columns.inner_error()).sum())
    return Grid(
        integrand,
        axes,
        columns,
        top + float(np.log(total)) + departed.ln_correction,
        float(np.sqrt(outer_error**2 + inner_error**2 + departed.doubt**2)),
        departed,
    )
