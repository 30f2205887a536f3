"""Maxima that the draws hardly reach: where a source turns back, its other sign may do as well.

A source whose two variations lie on one side, or nearly, moves a yield the same way whatever its sign: the
integrand may have two maxima. Quadrature and its mixture grow from one; if the other is far away, no draw
ends there and nothing in the weights tells.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.evidence.integral.nodes import laplace
from workbench.evidence.integral.proposal import propose
from workbench.evidence.integral.quadrature import Grid
from workbench.hypotheses.processes import Process
from workbench.hypotheses.shapes import Template
from workbench.hypotheses.uncertainties import Effect, Uncertainty, curvature
from workbench.likelihood.model import Model

Array = npt.NDArray[np.float64]
Indices = npt.NDArray[np.intp]

OTHER_MAXIMUM = "another maximum that draws hardly reach"  # how the reason begins
_STEEPEST = float(curvature(1e6)[1])  # of the even part, where it has become a line
_LN_WEIGHT = 3.0  # of a maximum that draws hardly reach: 20 times the mean weight
_LEAST_SHARE = 0.003  # of the evidence, that would matter
_LEAST_Z = 0.5
_MOST = 16
_LN_2PI = float(np.log(2.0 * np.pi))


@np.errstate(all="ignore")  # an impossible point has ln probability -inf
def share_unreached(grid: Grid, ln_evidence: float) -> float:
    """Return the largest share of an evidence that lies around a maximum which draws hardly reach.

    From the best node, with the signal coordinates held, Newton starts again with the sign changed of each
    source that turns back, and of all of them.

    Args:
        grid: the quadrature's nodes.
        ln_evidence: what sampling found [nats].

    Returns:
        The share; 0 where there is no such maximum.

    Source:
        None, definition.
    """
    turning = sources_that_turn(grid.integrand.model)
    if not turning.size:
        return 0.0
    integrand, columns = grid.integrand, grid.columns
    best = np.unravel_index(int(np.argmax(columns.ln_height)), columns.ln_height.shape)
    found = integrand.climb(_mirrored(columns.points[best], turning), integrand.nuisance)
    # Both of the integrand and of the proposal, the prior density in the outer coordinates is left out.
    outer = list(integrand.outer)
    taken_out = 0.5 * (found.points[:, outer] ** 2).sum(axis=1) + 0.5 * len(outer) * _LN_2PI
    hessians = found.hessians[:, integrand.nuisance[:, None], integrand.nuisance[None, :]]
    heights = found.values + taken_out + found.gains + laplace(hessians)
    ln_weights = found.values + taken_out - propose(grid).ln_density(found.points) - ln_evidence
    is_far = (ln_weights > _LN_WEIGHT) & found.converged & np.isfinite(heights)
    ln_ratio = np.where(is_far, heights - columns.ln_height[best], -np.inf).max()
    share = float(special.expit(ln_ratio))
    return share if share > _LEAST_SHARE else 0.0


def _mirrored(point: Array, turning: Indices) -> Array:
    """Return starting points: one source's sign changed, or all of them."""
    signs = np.concatenate([1.0 - 2.0 * np.eye(turning.size), -np.ones((1, turning.size))])
    away = np.where(np.abs(point[turning]) < _LEAST_Z, np.copysign(_LEAST_Z, point[turning]), point[turning])
    starts = np.repeat(point[None], len(signs), axis=0)
    starts[:, turning] = np.where(signs < 0.0, -away, point[turning])
    return starts


def sources_that_turn(model: Model) -> Indices:
    """Return the coordinates of sources that have an effect which turns back, at most sixteen.

    Args:
        model: the compiled hypothesis.

    Returns:
        Coordinates in order.

    Source:
        None, definition: the ln factor (u - d) z/2 + (u + d) g(z)/2 turns back where |u - d| is below |u + d|
        times the largest slope of g; over a template's bins, where the sums of these are.
    """
    names = {
        source.name
        for source in model.analysis.uncertainties
        if any(_turns(up, down) for up, down in _sizes(model, source))
    }
    found = [index for index, name in enumerate(model.names) if name in names]
    return np.array(found[:_MOST], dtype=np.intp)


def _turns(up: Array, down: Array) -> bool:
    return bool(np.abs(up - down).sum() < _STEEPEST * np.abs(up + down).sum())


def _sizes(model: Model, source: Uncertainty) -> Iterator[tuple[Array, Array]]:
    """Yield the ln factors at z = 1 and z = -1 of each two-sided effect; those of bins times their events."""
    processes = {process.name: process for process in model.analysis.processes_of(model.hypothesis)}
    for effect in source.effects:
        if effect.process not in processes or effect.down is None:
            continue
        if isinstance(effect.up, str) or isinstance(effect.down, str):
            yield from _bin_sizes(model, effect, processes[effect.process])
        else:
            yield np.log1p([effect.up]), np.log1p([effect.down])


def _bin_sizes(model: Model, effect: Effect, process: Process) -> Iterator[tuple[Array, Array]]:
    for name, into in process.regions.items():
        columns = model.analysis.region(name).table.columns
        wanted = (str(effect.up), str(effect.down))
        if isinstance(into.shape, Template) and all(column in columns for column in wanted):
            nominal, up, down = (columns[column] for column in (into.shape.column, *wanted))
            inside = (nominal > 0.0) & (up > 0.0) & (down > 0.0)
            nominal, up, down = nominal[inside], up[inside], down[inside]
            yield nominal * np.log(up / nominal), nominal * np.log(down / nominal)
