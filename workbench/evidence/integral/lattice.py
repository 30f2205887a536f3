"""Quasi-random points: rank-1 lattices with independent random shifts."""

from __future__ import annotations

from functools import lru_cache

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]

_LATTICE_DIMENSIONS = 32
_CANDIDATES = 128


@lru_cache(maxsize=32)
def _generator(points: int) -> tuple[int, ...]:
    """Return a generating vector found component by component.

    Minimises the worst-case error in the weighted space with kernel 1 + gamma_j (x^2 - x + 1/6) 2 pi^2,
    gamma_j = 1/j.

    Source:
        F. Kuo, I. Sloan, component-by-component construction of lattice rules (2002-2005); from memory.
    """
    chooser = np.random.default_rng(points)
    odd = np.arange(1, points, 2)
    indices = np.arange(points)
    product = np.ones(points)
    vector: list[int] = []
    for dimension in range(_LATTICE_DIMENSIONS):
        if dimension == 0:
            candidates = np.array([1])
        else:
            size = min(_CANDIDATES, odd.size)
            candidates = chooser.choice(odd, size=size, replace=False)
        x = (candidates[:, None] * indices[None, :] % points) / points
        kernel = 1.0 + (x * x - x + 1.0 / 6.0) * (2.0 * np.pi**2) / (dimension + 1.0)
        best = int(np.argmin(kernel @ product))
        product = product * kernel[best]
        vector.append(int(candidates[best]))
    return tuple(vector)


def shifted_lattices(
    points: int, dimensions: int, scrambles: int, generator: np.random.Generator, lots: int = 0
) -> Array:
    """Return independent randomised point sets, each spread evenly over the unit cube.

    A lattice is shifted at random and folded by the tent map, which makes smooth integrands that are not
    periodic converge as periodic ones do. Dimensions beyond the lattice's are stratified at random.

    Args:
        points: points in each set; a power of 2.
        dimensions: coordinates of a point.
        scrambles: number of independent sets.
        generator: where the shifts come from.
        lots: how many more dimensions to stratify at random: for choices, whose shares come out right in each
            set, and which a lattice's few generators would tie to each other.

    Returns:
        (scramble, point, dimension + lots) numbers strictly inside (0, 1).

    Source:
        I. Sloan, S. Joe, Lattice Methods for Multiple Integration (1994); tent map: F. Hickernell (2002);
        both from memory.
    """
    spread = min(dimensions, _LATTICE_DIMENSIONS)
    vector = np.array(_generator(points)[:spread])
    base = (np.arange(points)[:, None] * vector[None, :] % points) / points
    shifts = generator.random((scrambles, 1, spread))
    folded = 1.0 - np.abs(2.0 * ((base[None] + shifts) % 1.0) - 1.0)
    loose = dimensions - spread + lots
    if loose:
        order = generator.random((scrambles, loose, points)).argsort(axis=2)
        rest = np.swapaxes((order + generator.random(order.shape)) / points, 1, 2)
        folded = np.concatenate([folded, rest], axis=2)
    return np.asarray(np.clip(folded, 1e-12, 1.0 - 1e-12))
