"""The evidence under another prior of the inner strength, from the nodes that stand.

At the nodes of a column the ln marginal likelihood at a strength is known, nuisance coordinates integrated.
It is smooth in the strength, so that it is interpolated between nodes and summed against any prior that does
not reach beyond what the nodes hold.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from workbench.evidence.integral.quadrature import Grid
from workbench.hypotheses.priors import Prior

Array = npt.NDArray[np.float64]

_POINTS = 601
_NEGLIGIBLE = 0.005
_TAIL = 1e-6
_LN_2PI = float(np.log(2.0 * np.pi))


@np.errstate(all="ignore")
def ln_change(grid: Grid, prior: Prior) -> float | None:
    """Return how ln evidence changes when the inner strength has another prior.

    With R(s) the ln marginal likelihood at strength s in each column:
        Z = sum over columns of w_c int R_c(s) prior(s) ds

    Args:
        grid: the quadrature, whose inner coordinate is the strength.
        prior: another prior of the strength.

    Returns:
        ln of the ratio of both sums [nats]; None where the prior goes beyond what the nodes hold.

    Source:
        None, definition; local cubic interpolation of ln R between evenly spaced nodes.
    """
    inner, columns = grid.integrand.inner, grid.columns
    if inner is None:
        return None
    declared = grid.integrand.model.coordinates[inner].prior
    place = np.linspace(0.0, columns.inner.shape[1] - 1.0, _POINTS)
    step = columns.inner[:, 1] - columns.inner[:, 0]
    t = columns.inner[:, :1] + step[:, None] * place
    ln_likelihood = _between(columns.ln_height + 0.5 * columns.inner**2, place)
    strength, slope, _ = declared.from_standard(t)
    before = ln_likelihood - 0.5 * t * t
    after = ln_likelihood + prior.ln_density(strength) + np.log(slope) + 0.5 * _LN_2PI
    weights = _column_weights(grid) * step
    if _is_cut(ln_likelihood + prior.ln_density(strength), weights / step, prior, strength):
        return None
    return _ln_sum(after, weights) - _ln_sum(before, weights)


def _between(values: Array, place: Array) -> Array:
    """Return (column, point) cubic interpolation of (column, node) values at places counted in nodes."""
    last = values.shape[1] - 1
    first = np.clip(np.floor(place).astype(int) - 1, 0, last - 3)
    x = place - first
    weights = (
        -(x - 1.0) * (x - 2.0) * (x - 3.0) / 6.0,
        x * (x - 2.0) * (x - 3.0) / 2.0,
        -x * (x - 1.0) * (x - 3.0) / 2.0,
        x * (x - 1.0) * (x - 2.0) / 6.0,
    )
    return np.asarray(sum(weight * values[:, first + k] for k, weight in enumerate(weights)))


def _column_weights(grid: Grid) -> Array:
    weights = np.ones(1)
    for axis in grid.axes:
        weights = np.outer(weights, axis.weights).ravel()
    return weights


def _ln_sum(heights: Array, weights: Array) -> float:
    top = float(heights.max())
    return top + float(np.log((np.exp(heights - top).sum(axis=1) * weights).sum()))


def _is_cut(ln_integrand: Array, weights: Array, prior: Prior, strength: Array) -> bool:
    """Return True where what the new prior holds beyond the nodes may matter.

    The integrand at the last strength, times how far it falls at the rate it has there or how far the prior
    reaches, bounds what is cut off.
    """
    low, high = (float(end) for end in prior.quantile(np.array([_TAIL, 1.0 - _TAIL])))
    integrand = np.exp(ln_integrand - ln_integrand.max()) * weights[:, None]
    step = np.diff(strength, axis=1)
    held = float((0.5 * (integrand[:, 1:] + integrand[:, :-1]) * step).sum())
    down = (ln_integrand[:, 1] - ln_integrand[:, 0]) / step[:, 0]
    up = (ln_integrand[:, -2] - ln_integrand[:, -1]) / step[:, -1]
    below = integrand[:, 0] * np.clip(strength[:, 0] - low, 0.0, _fall(down))
    above = integrand[:, -1] * np.clip(high - strength[:, -1], 0.0, _fall(up))
    return bool(np.nansum(below) + np.nansum(above) > _NEGLIGIBLE * held)


def _fall(rate: Array) -> Array:
    """Return how far an exponential fall goes on; endless where there is none."""
    return np.where(rate > 0.0, 1.0 / np.maximum(rate, 1e-300), np.inf)
