"""Marks for small counts: intervals that are right at 0, 1, 2, and an excess that means something there."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]

ONE_SD = 0.6826894921370859  # normal probability within one standard deviation


def interval(observed: npt.ArrayLike, level: float = ONE_SD) -> tuple[Array, Array]:
    """Return the central interval of a Poisson mean for each observed count.

    With a = (1 - level)/2:
        low = gamma quantile of a at shape n (0 for n = 0),   high = gamma quantile of 1 - a at shape n + 1

    Args:
        observed: (...) counted events [events]; integers >= 0.
        level: smallest coverage; in (0, 1).

    Returns:
        (...) low and (...) high [events].

    Source:
        F. Garwood, Biometrika 28 (1936) 437.
    """
    from scipy import special

    counts = np.asarray(observed, dtype=float)
    tail = 0.5 * (1.0 - level)
    low = special.gammaincinv(np.maximum(counts, 1.0), tail)
    high = special.gammainccinv(counts + 1.0, tail)
    return np.where(counts > 0.0, low, 0.0), np.asarray(high)


def excess(observed: npt.ArrayLike, expected: npt.ArrayLike) -> Array:
    """Return by how many standard deviations a number of events exceeds another.

    With n = observed, v = expected:
        sign(n - v) sqrt(2 (n ln(n/v) - n + v))

    which is (n - v)/sqrt(v) for large counts, and keeps its meaning for small ones.

    Args:
        observed: (...) number of events [events]; >= 0.
        expected: (...) expected events [events]; >= 0.

    Returns:
        (...) excess [standard deviations]; infinite where nothing was expected and something was seen.

    Source:
        P. McCullagh and J.A. Nelder, Generalized Linear Models (1989), deviance residuals; from memory.
    """
    n, v = np.broadcast_arrays(np.asarray(observed, dtype=float), np.asarray(expected, dtype=float))
    seen, possible = n > 0.0, v > 0.0
    ratio = np.where(seen & possible, n, 1.0) / np.where(seen & possible, v, 1.0)
    deviance = np.where(seen, n * np.log(ratio), 0.0) - n + v
    size = np.sqrt(2.0 * np.maximum(deviance, 0.0))
    return np.where(seen & ~possible, np.inf, np.sign(n - v) * size)
