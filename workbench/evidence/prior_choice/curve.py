"""ln R of one strength: the marginal likelihood with the strength held, over the other hypothesis' evidence.

Between nodes ln R is a cubic spline in c ln(1 + s/c), with c the strength at which the signal is as large as
the background where it first is: for a count, ln R = n ln(1 + s/c) - s y, which bends sharply in s near 0
but not in that.

R holds no prior of the strength: the Bayes factor under any prior is the average of R over it. Nuisance
parameters, and signal parameters other than this strength, are averaged over their stated priors.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]
Flags = npt.NDArray[np.bool_]

FLOOR = -18.0  # ln R below which the curve ends
LEAST_TOLD = -12.0  # averages below it are only said to be below it: what lies beyond the curve might matter
_FINE = 4000
_NEAR_ZERO = 400
_SMALLEST_SHARE = 1e-9


@dataclass(frozen=True, eq=False)
class StrengthCurve:
    """ln R on nodes of a strength, smooth between them.

    Attributes:
        strengths: (node,) ascending, from 0 on.
        ln_ratio: (node,) ln R [nats].
        errors: (node,) one standard error of the held hypothesis' ln evidence [nats].
        between: (node,) what interpolation beside a node may add to it [nats].
        against_error: one standard error of the other hypothesis' ln evidence, common to all nodes [nats].
        established: (node,) True where the evidence is.
        reasons: (node,) why it is not; empty where it is.
        is_ended: True when ln R has fallen below the floor at the last node.
        scale: c.
    """

    strengths: Array
    ln_ratio: Array
    errors: Array
    between: Array
    against_error: float
    established: Flags
    reasons: tuple[str, ...]
    is_ended: bool
    scale: float

    @property
    def reach(self) -> float:
        """Return the last strength."""
        return float(self.strengths[-1])

    @cached_property
    def edges(self) -> Array:
        """Return (cell + 1,) strengths between which R is averaged, dense towards 0 as well."""
        near = np.geomspace(_SMALLEST_SHARE * self.reach, self.reach, _NEAR_ZERO)
        even = np.linspace(0.0, self.reach, _FINE + 1)
        return np.unique(np.concatenate([even, near, self.strengths]))

    @cached_property
    def ln_cells(self) -> Array:
        """Return (cell,) ln of R averaged evenly over each cell, by Simpson's rule [nats]."""
        edges = self.edges
        ends, middles = self.at(edges), self.at(0.5 * (edges[1:] + edges[:-1]))
        parts = np.stack([ends[:-1], middles + np.log(4.0), ends[1:]])
        return np.asarray(np.logaddexp.reduce(parts, axis=0) - np.log(6.0))

    @cached_property
    def cell_errors(self) -> Array:
        """Return (cell,) error of ln R in each cell, the other hypothesis' left out [nats]."""
        middles = 0.5 * (self.edges[1:] + self.edges[:-1])
        return np.interp(middles, self.strengths, np.hypot(self.errors, self.between))

    def at(self, strengths: Array) -> Array:
        """Return ln R at some strengths, (...) [nats]; the last node's slope goes on beyond it."""
        return smooth(self.strengths, self.ln_ratio, strengths, self.scale)

    def error_at(self, strength: float) -> float:
        """Return the whole numerical error of ln R at a strength [nats]."""
        own = float(np.interp(strength, self.strengths, np.hypot(self.errors, self.between)))
        return float(np.hypot(own, self.against_error))

    def doubt(self) -> str:
        """Return why the curve is not established; empty when it is.

        Only strengths count that a verdict may rest on: those with ln R above -12.
        """
        matters = self.ln_ratio > LEAST_TOLD
        for place in np.flatnonzero(matters & ~self.established):
            return f"held at strength {self.strengths[place]:.4g}: {self.reasons[place]}"
        return ""


def stretched(strengths: Array, scale: float) -> Array:
    """Return c ln(1 + s/c), in which ln R is smooth.

    Args:
        strengths: (...) s; >= 0.
        scale: c; > 0.
    """
    return np.asarray(scale * np.log1p(strengths / scale))


def middle(low: float, high: float, scale: float) -> float:
    """Return the strength half way between two in c ln(1 + s/c)."""
    half = 0.5 * (np.log1p(low / scale) + np.log1p(high / scale))
    return float(scale * np.expm1(half))


def smooth(nodes: Array, values: Array, wanted: Array, scale: float) -> Array:
    """Return a cubic spline through nodes, its last slope in s going on beyond the last node.

    Args:
        nodes: (node,) strengths, ascending.
        values: (node,) values there.
        wanted: (...) strengths.
        scale: c of the variable that the spline is in.

    Returns:
        (...) interpolated values.
    """
    from scipy.interpolate import make_interp_spline

    places, inside = stretched(nodes, scale), np.minimum(wanted, nodes[-1])
    if nodes.size < 4:
        return np.interp(stretched(inside, scale), places, values)
    spline = make_interp_spline(places, values, k=3)
    slope = min(float(spline.derivative()(places[-1])) / (1.0 + float(nodes[-1]) / scale), 0.0)
    return np.asarray(spline(stretched(inside, scale)) + slope * (wanted - inside))
