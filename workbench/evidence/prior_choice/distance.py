"""How far two weightings of one sample lie apart."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]

_LEFT_OUT = 1.0 / 4000.0


def cumulative_distance(values: Array, before: Array, after: Array) -> float:
    """Return the cumulative Jensen-Shannon distance between two weightings of the same values.

    With P and Q the two distribution functions and M = (P + Q)/2:
        D^2 = int [ P log2(P/M) + Q log2(Q/M) ] dx / int (P + Q) dx

    and the larger of that and the same seen from above, with 1 - P and 1 - Q. The integrals run over the
    range that holds all but 1/4000 of P on either side, as a sample of a few thousand would.

    Args:
        values: (draw,) where the draws lie.
        before: (draw,) weights; >= 0, need not add up to 1.
        after: (draw,) other weights.

    Returns:
        A distance from 0 to 1: 0.066 for standard normal laws 0.3 apart.

    Source:
        H.-V. Nguyen, J. Vreeken, Non-parametric Jensen-Shannon divergence (2015), as used by N. Kallioinen,
        T. Paananen, P.-C. Buerkner, A. Vehtari, Detecting and diagnosing prior and likelihood sensitivity
        with power-scaling, Stat. Comput. 34 (2024) 57; from memory.
    """
    order = np.argsort(values)
    x = values[order]
    p = np.cumsum(before[order]) / before.sum()
    q = np.cumsum(after[order]) / after.sum()
    first, last = np.searchsorted(p, [_LEFT_OUT, 1.0 - _LEFT_OUT])
    inside = slice(int(first), max(int(last), int(first) + 1))
    step = np.diff(x)[inside]
    p, q = p[:-1][inside], q[:-1][inside]
    seen = [_divergence(p, q, step), _divergence(1.0 - p, 1.0 - q, step)]
    return float(np.sqrt(max(*seen, 0.0)))


def _divergence(p: Array, q: Array, step: Array) -> float:
    whole = float(((p + q) * step).sum())
    if whole <= 0.0:
        return 0.0
    middle = np.maximum(0.5 * (p + q), 1e-300)
    parts = _information(p, middle) + _information(q, middle)
    return float((parts * step).sum()) / whole


def _information(p: Array, middle: Array) -> Array:
    ratio = np.where(p > 0.0, p / middle, 1.0)
    return np.asarray(np.maximum(p, 0.0) * np.log2(np.maximum(ratio, 1e-300)))
