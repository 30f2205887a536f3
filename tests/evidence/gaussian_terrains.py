"""Likelihoods over standard-normal coordinates whose evidence is a Gaussian integral, done by hand."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt
from scipy import special, stats

from workbench.evidence.annealing.exchange import Involutions
from workbench.evidence.annealing.moves import LnLikelihood, Terrain

Array = npt.NDArray[np.float64]


def terrain(size: int, ln_likelihood: LnLikelihood) -> Terrain:
    """Return a terrain of which nothing is known: every coordinate is a block, and has its mirror."""
    same = np.repeat(np.arange(size)[None], size, axis=0)
    mirrors = Involutions(same, 1.0 - 2.0 * np.eye(size))
    groups = (np.arange(size),) if 1 < size <= 5 else ()
    return Terrain(size, ln_likelihood, np.eye(size, dtype=bool), groups, mirrors)


def bells(size: int, *parts: tuple[float, float | Sequence[float], float]) -> tuple[Terrain, float]:
    """Return a sum of round bells, (weight, centre, sd) each, and the exact ln evidence.

    The integral of N(x; m, s^2) N(x; 0, 1) is N(m; 0, 1 + s^2) in each coordinate.
    """
    centres = [np.broadcast_to(np.asarray(centre, dtype=float), size) for _, centre, _ in parts]

    def ln_likelihood(points: Array) -> Array:
        found = [
            np.log(weight) + stats.norm.logpdf(points, centre, sd).sum(axis=-1)
            for (weight, _, sd), centre in zip(parts, centres, strict=True)
        ]
        return np.asarray(special.logsumexp(found, axis=0))

    exact = [
        np.log(weight) + stats.norm.logpdf(centre, 0.0, np.hypot(1.0, sd)).sum()
        for (weight, _, sd), centre in zip(parts, centres, strict=True)
    ]
    return terrain(size, ln_likelihood), float(special.logsumexp(exact))


def ridge(size: int, sd: float) -> tuple[Terrain, float]:
    """Return a likelihood of the coordinates' sum alone, known to sd, and the exact ln evidence."""

    def ln_likelihood(points: Array) -> Array:
        return np.asarray(stats.norm.logpdf(points.sum(axis=-1), 2.0, sd))

    return terrain(size, ln_likelihood), float(stats.norm.logpdf(2.0, 0.0, np.sqrt(size + sd**2)))
