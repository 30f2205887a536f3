"""Batches of small matrices: roots, and products with the matrix that each vector belongs to."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]
Indices = npt.NDArray[np.intp]

_GATHERED = 16
_SMALLEST = 0.05


def upper_roots(matrices: Array) -> Array:
    """Return upper-triangular R with R'R = matrix; eigenvalues too small for that are raised first."""
    try:
        return np.swapaxes(np.linalg.cholesky(matrices), 1, 2)
    except np.linalg.LinAlgError:
        values, vectors = np.linalg.eigh(matrices)
        mended = (vectors * np.maximum(values, _SMALLEST)[:, None, :]) @ np.swapaxes(vectors, 1, 2)
        return np.swapaxes(np.linalg.cholesky(mended), 1, 2)


def grouped(matrices: Array, where: Indices, vectors: Array) -> Array:
    """Return matrices[where] @ vectors, group by group where the matrices are large."""
    if vectors.shape[1] <= _GATHERED:
        return np.asarray((matrices[where] @ vectors[..., None])[..., 0])
    result = np.empty_like(vectors)
    order = np.argsort(where, kind="stable")
    ends = np.cumsum(np.bincount(where, minlength=len(matrices)))
    for group, rows in enumerate(np.split(order, ends[:-1])):
        if rows.size:
            result[rows] = vectors[rows] @ matrices[group].T
    return result


def unwhitened(matrices: Array, where: Indices, vectors: Array) -> Array:
    """Return x of matrices[where] @ x = vectors, group by group where the matrices are large."""
    if vectors.shape[1] == 0:
        return vectors
    if vectors.shape[1] <= _GATHERED and len(matrices) > len(vectors):
        return np.asarray(np.linalg.solve(matrices[where], vectors[..., None])[..., 0])
    return grouped(np.asarray(np.linalg.inv(matrices)), where, vectors)
