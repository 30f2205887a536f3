"""The most that a p-value can be worth as a Bayes factor."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]


def ln_largest_from_p(p: npt.ArrayLike) -> Array:
    """Return the largest ln B10 that a p-value allows over a wide class of alternatives.

    For p < 1/e, with p uniform under the null hypothesis and its ln-hazard decreasing under the alternative:
        B10 <= 1/(-e p ln p),   ln B10 <= -1 - ln p - ln(-ln p)

    Args:
        p: (...) p-value; 0 < p <= 1.

    Returns:
        (...) the bound on ln B10 [nats]; 0 from p = 1/e on.

    Limits:
        A bound on alternatives of that class, not on every prior: a point at the best strength may exceed it.

    Source:
        T. Sellke, M.J. Bayarri, J.O. Berger, Calibration of p values for testing precise null hypotheses,
        Am. Stat. 55 (2001) 62, equation 2.
    """
    return ln_largest_from_ln_p(np.log(np.asarray(p, dtype=float)))


def ln_largest_from_ln_p(ln_p: npt.ArrayLike) -> Array:
    """Return the same for p-values too small to be written down.

    Args:
        ln_p: (...) ln of the p-value; <= 0.

    Returns:
        (...) the bound on ln B10 [nats].

    Source:
        `ln_largest_from_p`.
    """
    value = np.minimum(np.asarray(ln_p, dtype=float), -1.0)
    return np.asarray(-1.0 - value - np.log(-value))
