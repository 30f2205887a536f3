"""Random orders of the bins, each followed by its reverse."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

Indices = npt.NDArray[np.intp]


def random_orders(bins: int, number: int, seed: np.random.SeedSequence) -> Indices:
    """Return random orders of the bins, each followed by its reverse.

    A bin that comes early in an order comes late in its reverse, which evens out most of what a share owes to
    its place.

    Args:
        bins: number of bins.
        number: number of random orders.
        seed: where they come from.

    Returns:
        (2 number, bin) orders: pass 2 k + 1 is pass 2 k reversed.

    Source:
        Antithetic permutations, as for Shapley values; from memory.
    """
    generator = np.random.default_rng(seed)
    forward = generator.permuted(np.tile(np.arange(bins), (number, 1)), axis=1)
    return np.asarray(np.stack([forward, forward[:, ::-1]], axis=1).reshape(2 * number, bins), dtype=np.intp)
