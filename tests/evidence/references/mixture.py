"""Mixtures of normals: fitted to weighted points, their density, draws from them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy import linalg, special

Array = npt.NDArray[np.float64]


@dataclass(frozen=True)
class Mixture:
    """A mixture of normals.

    Attributes:
        shares: (part,) probabilities, summing up to 1.
        means: (part, dimension).
        roots: (part, dimension, dimension) lower-triangular roots of the covariances.
    """

    shares: Array
    means: Array
    roots: Array

    def ln_parts(self, points: Array) -> Array:
        """Return (part, row) ln share times density."""
        size = points.shape[1]
        found = np.empty((self.shares.size, len(points)))
        for place, (share, mean, root) in enumerate(zip(self.shares, self.means, self.roots, strict=True)):
            inverse = linalg.solve_triangular(root, np.eye(size), lower=True)
            white = (points - mean) @ inverse.T
            constant = np.log(share) - np.log(np.diag(root)).sum() - 0.5 * size * np.log(2.0 * np.pi)
            found[place] = constant - 0.5 * np.einsum("na,na->n", white, white)
        return found

    def ln_density(self, points: Array) -> Array:
        """Return (row,) ln density."""
        return np.asarray(special.logsumexp(self.ln_parts(points), axis=0))

    def draw(self, cube: Array) -> Array:
        """Return (row, dimension) points of (row, dimension + 1) uniform numbers, the first for the part."""
        ends = np.cumsum(self.shares)
        part = np.minimum(np.searchsorted(ends, cube[:, 0] * ends[-1]), self.shares.size - 1)
        normal = special.ndtri(np.clip(cube[:, 1:], 1e-15, 1.0 - 1e-15))
        points: Array = np.empty_like(normal)
        for place in range(self.shares.size):
            chosen = part == place
            points[chosen] = self.means[place] + normal[chosen] @ self.roots[place].T
        return points

    def guarded(self, wide: float = 0.08, prior: float = 0.04) -> Mixture:
        """Return the mixture with each part also half as wide again, and with the standard-normal prior.

        The prior's share keeps every weight below the largest likelihood over it, so that no mode is lost
        without a trace and the weights' variance is finite.
        """
        size = self.means.shape[1]
        return Mixture(
            np.concatenate([(1.0 - wide - prior) * self.shares, wide * self.shares, [prior]]),
            np.concatenate([self.means, self.means, np.zeros((1, size))]),
            np.concatenate([self.roots, 1.5 * self.roots, np.eye(size)[None]]),
        )


def fitted(points: Array, weights: Array, start: Mixture, rounds: int = 8) -> Mixture:
    """Return a mixture fitted to weighted points by expectation maximisation.

    Covariances lean towards their mean over the parts, the more the fewer points they have.
    """
    size = points.shape[1]
    weights = weights / weights.sum()
    effective = 1.0 / (weights**2).sum()
    now = start
    for _ in range(rounds):
        ln_parts = now.ln_parts(points)
        shares = np.exp(ln_parts - special.logsumexp(ln_parts, axis=0)) * weights
        held = shares.sum(axis=1)
        kept = held * effective > 1.0 + 0.2 * size
        if not kept.any():
            kept = held == held.max()
        shares, held = shares[kept], held[kept]
        means = shares @ points / held[:, None]
        spreads = np.array(
            [
                ((points - mean) * share[:, None]).T @ (points - mean) / total
                for mean, share, total in zip(means, shares, held, strict=True)
            ]
        )
        common = np.einsum("k,kab->ab", held, spreads) / held.sum()
        lean = 0.5 * size / (0.5 * size + held * effective)
        spreads = (1.0 - lean)[:, None, None] * spreads + lean[:, None, None] * common
        spreads = (
            spreads + 1e-12 * np.eye(size) + 1e-8 * np.einsum("kaa->ka", spreads)[:, None] * np.eye(size)
        )
        now = Mixture(held / held.sum(), means, np.linalg.cholesky(spreads))
    return now


def started(points: Array, weights: Array, parts: int, rng: np.random.Generator) -> Mixture:
    """Return a first mixture around points that lie far apart."""
    weights = weights / weights.sum()
    centre = weights @ points
    spread = ((points - centre) * weights[:, None]).T @ (points - centre) + 1e-12 * np.eye(points.shape[1])
    root = np.linalg.cholesky(spread)
    white = linalg.solve_triangular(root, (points - centre).T, lower=True).T
    chosen = [int(rng.choice(len(points), p=weights))]
    nearest = np.full(len(points), np.inf)
    for _ in range(parts - 1):
        nearest = np.minimum(nearest, ((white - white[chosen[-1]]) ** 2).sum(axis=1))
        likely = nearest * weights
        if not likely.sum() > 0.0:
            break
        chosen.append(int(rng.choice(len(points), p=likely / likely.sum())))
    each = len(chosen)
    narrow = each ** (-1.0 / min(points.shape[1], 3))
    return Mixture(np.full(each, 1.0 / each), points[chosen], np.repeat(narrow * root[None], each, axis=0))
