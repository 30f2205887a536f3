"""Brute quadrature in one and two dimensions: even grids over a standard-normal plane, made finer and finer.

The integrand falls off like a normal density on every side, where the plain sum over an even grid converges
faster than any power of its step.
"""

from __future__ import annotations

from collections.abc import Callable
from itertools import pairwise

import numpy as np
import numpy.typing as npt
from scipy import special

from tests.evidence.references.importance import Reference

Array = npt.NDArray[np.float64]
LnLikelihood = Callable[[Array], Array]

REACH = 9.0  # standard deviations of the prior that the grid spans at first
_FARTHEST = 37.0  # where a normal tail is still a number
_NEGLIGIBLE = -40.0  # ln of the height, relative to the largest, that is left out
_LEAST_ERROR = 1e-7
_FIRST, _FINER = {1: 4001, 2: 361}, {1: (2001, 8001, 32001), 2: (301, 601, 1201)}


def integrated(ln_likelihood: LnLikelihood, size: int) -> Reference:
    """Return the ln evidence of one or two dimensions over a standard-normal prior.

    The error is the change that the last halving of the step made.
    """
    ends = np.repeat([[-REACH, REACH]], size, axis=0)
    used = 0
    for _ in range(2):  # the first grid says where anything is, the second where exactly
        axes, heights = _grid(ln_likelihood, ends, _FIRST[size])
        used += heights.size
        ends = _occupied(axes, heights)
        if np.abs(ends).max() > REACH - 0.1:  # far from what the prior expects
            axes, heights = _grid(
                ln_likelihood, np.sign(ends - ends.mean(axis=1, keepdims=True)) * _FARTHEST, _FIRST[size]
            )
            used += heights.size
            ends = _occupied(axes, heights)
    found = []
    for nodes in _FINER[size]:
        axes, heights = _grid(ln_likelihood, ends, nodes)
        used += heights.size
        steps = sum(float(np.log(axis[1] - axis[0])) for axis in axes)
        found.append(float(special.logsumexp(heights)) + steps)
        changes = [abs(b - a) for a, b in pairwise(found)]
        if changes and changes[-1] < _LEAST_ERROR:
            break
    return Reference(found[-1], max(changes[-1], _LEAST_ERROR), "quadrature", used)


def _grid(ln_likelihood: LnLikelihood, ends: Array, nodes: int) -> tuple[list[Array], Array]:
    """Return the axes and (node, ...) ln of likelihood times prior."""
    axes = [np.linspace(low, high, nodes) for low, high in ends]
    points = np.stack([part.ravel() for part in np.meshgrid(*axes, indexing="ij")], axis=1)
    prior = -0.5 * (points**2).sum(axis=1) - 0.5 * len(axes) * np.log(2.0 * np.pi)
    heights = np.nan_to_num(
        ln_likelihood(points) + prior, nan=-np.inf
    )  # where so much is expected that P is 0
    return axes, heights.reshape([nodes] * len(axes))


def _occupied(axes: list[Array], heights: Array) -> Array:
    """Return the range of each axis that holds anything, one node more on each side."""
    inside = heights > heights.max() + _NEGLIGIBLE
    ends = []
    for place, axis in enumerate(axes):
        along = np.flatnonzero(inside.any(axis=tuple(other for other in range(len(axes)) if other != place)))
        ends.append([axis[max(along[0] - 1, 0)], axis[min(along[-1] + 1, axis.size - 1)]])
    return np.array(ends)
