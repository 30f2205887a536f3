"""How the nuisance coordinates' maximum moves with the signal coordinates, from node to node."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from workbench.evidence.integral.quadrature import Grid

Array = npt.NDArray[np.float64]


def responses(grid: Grid) -> Array:
    """Return the change of the nuisance coordinates' maximum with each signal coordinate.

    Differences between neighbouring nodes. Columns have their own inner nodes, so that from one column to the
    next the k-th node moves along the inner coordinate too, which is taken out:

        d theta/dx at fixed t = d theta/dx along k - (d theta/dt) (d t_k/dx)

    Args:
        grid: the quadrature's nodes.

    Returns:
        (column x inner, signal, nuisance) derivatives: in x of the outer coordinates, in the standard
        coordinate of the inner one.

    Source:
        None, definition (chain rule).
    """
    integrand, columns = grid.integrand, grid.columns
    sizes = [axis.nodes.size for axis in grid.axes]
    inner = columns.inner
    maxima = columns.points[..., integrand.nuisance]
    along = np.zeros_like(maxima)
    if columns.has_inner and inner.shape[1] > 2:
        step = (inner[:, 1] - inner[:, 0])[:, None, None]
        along = np.gradient(maxima, axis=1, edge_order=2) / step
    found = []
    for which, index in enumerate(integrand.outer):
        if sizes[which] < 2:
            found.append(np.zeros_like(maxima))
            continue
        places = columns.outer[:, which].reshape(sizes)
        first = np.moveaxis(places, which, 0).reshape(sizes[which], -1)[:, 0]
        x = integrand.model.coordinates[index].prior.from_standard(first)[0]
        moved = np.gradient(maxima.reshape(*sizes, *maxima.shape[1:]), x, axis=which).reshape(maxima.shape)
        shifted = np.gradient(inner.reshape(*sizes, inner.shape[1]), x, axis=which).reshape(inner.shape)
        found.append(moved - along * shifted[..., None])
    if integrand.inner is not None:
        found.append(along)
    stacked = np.stack(found, axis=2) if found else np.zeros((*inner.shape, 0, integrand.nuisance.size))
    return np.nan_to_num(stacked.reshape(inner.size, len(found), integrand.nuisance.size))
