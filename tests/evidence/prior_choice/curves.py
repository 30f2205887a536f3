"""Curves of a strength written down by hand."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import numpy.typing as npt

from workbench.evidence.prior_choice.curve import StrengthCurve

Array = npt.NDArray[np.float64]
Function = Callable[[Array], Array]


def curve_of(ln_ratio: Function, reach: float, nodes: int = 400, error: float = 0.0) -> StrengthCurve:
    """Return the curve of a function of the strength."""
    strengths = np.linspace(0.0, reach, nodes)
    return StrengthCurve(
        strengths,
        np.asarray(ln_ratio(strengths)),
        np.full(nodes, error),
        np.zeros(nodes),
        0.0,
        np.ones(nodes, dtype=bool),
        ("",) * nodes,
        True,
        1e12,
    )


def counted(observed: float, background: float, yields: float) -> Function:
    """Return ln R of one count on a known background: n ln(1 + s y/b) - s y."""
    return lambda s: observed * np.log1p(s * yields / background) - s * yields
