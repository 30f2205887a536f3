"""Asymmetric errors: how far each parameter goes until the penalised ln likelihood has fallen by 1/2."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from workbench.likelihood.covariance import LIMIT_SHARE, Spread
from workbench.likelihood.newton import maximise
from workbench.likelihood.objective import FitObjective

Array = npt.NDArray[np.float64]
Indices = npt.NDArray[np.intp]
Side = float | None

_FALL = 0.5
_CLOSE = 1e-6
_NARROW = 1e-12
_MOST = 60
_LONGEST_STRIDE = 3.0


@dataclass(frozen=True, slots=True, eq=False)
class Summit:
    """A best point and what is known around it.

    Attributes:
        objective: what was maximised.
        counts: (bin,) counted events [events].
        best: (coordinate,) the best point.
        value: penalised ln likelihood there [nats].
        scale: (coordinate,) a length for each coordinate.
        spread: the covariance there.
    """

    objective: FitObjective
    counts: Array
    best: Array
    value: float
    scale: Array
    spread: Spread


def sides(summit: Summit, wanted: Indices) -> tuple[dict[int, tuple[Side, Side]], Array]:
    """Return the errors on both sides of some coordinates, all searched for at once.

    Along coordinate i the rest is maximised again, p(x_i), and x_i is found where p has fallen by 1/2. The
    root of twice the fall grows in proportion to the distance for a parabola, so Newton's method on it, with
    the exact slope dp/dx_i = df/dx_i, needs few steps; a bracket keeps it safe.

    Args:
        summit: the best point.
        wanted: indices of the coordinates.

    Returns:
        Coordinate to (low, high) distances, low ones negative and None where p has not fallen by 1/2 within
        the range; and the best point met, which is another one than the summit's where the search came upon a
        higher one.

    Source:
        W.T. Eadie et al., Statistical Methods in Experimental Physics (1971); from memory.
    """
    index = np.repeat(wanted, 2)
    sign = np.tile([-1.0, 1.0], wanted.size)
    best, objective = summit.best, summit.objective
    room = np.where(sign < 0.0, best[index] - objective.low[index], objective.high[index] - best[index])
    open_side = room > LIMIT_SHARE * summit.scale[index]
    search = _Search(summit, index[open_side], sign[open_side], room[open_side])
    distances = search.run()
    found: dict[int, tuple[Side, Side]] = {}
    for one in wanted:
        low, high = (
            next((d for d in distances[(search.index == one) & (search.sign == way)] if np.isfinite(d)), None)
            for way in (-1.0, 1.0)
        )
        found[int(one)] = (None if low is None else -float(low), None if high is None else float(high))
    return found, search.highest


class _Search:
    """The search for all sides: one row a side, state in arrays."""

    def __init__(self, summit: Summit, index: Indices, sign: Array, room: Array) -> None:
        self.summit, self.index, self.sign, self.room = summit, index, sign, room
        self.inner, self.outer = np.zeros(len(index)), np.full(len(index), np.inf)
        self.highest, self.height = summit.best, summit.value
        self.distance, self.points = self._first()

    def _first(self) -> tuple[Array, Array]:
        """Return distances by the parabola, and points there with the rest moved along its ridge."""
        summit, index = self.summit, self.index
        spread = summit.spread
        _, gradient, hessian = summit.objective.derivatives(summit.best[None], summit.counts)
        steep = np.maximum(-self.sign * gradient[0, index], 0.0)
        bend = np.maximum(-hessian[0, index, index], 0.0)
        alone = 1.0 / np.maximum(steep + np.sqrt(steep**2 + bend), 0.1 / summit.scale[index])
        distance = np.where(spread.has_error[index], spread.errors[index], alone)
        distance = np.minimum(distance, self.room)
        variance = np.where(spread.has_error, np.diag(spread.covariance), 1.0)
        ridge = spread.covariance[index] / variance[index, None]
        ridge[np.arange(len(index)), index] = 1.0
        return distance, summit.best + ridge * (self.sign * distance)[:, None]

    def run(self) -> Array:
        """Return (side,) distances at which the fall is 1/2; nan where there is none."""
        result = np.full(len(self.index), np.nan)
        active = np.arange(len(self.index))
        for _ in range(_MOST):
            if active.size == 0:
                break
            fall, slope = self._fall(active)
            root = np.sqrt(2.0 * np.maximum(fall, 0.0))
            done = np.abs(root - 1.0) < _CLOSE
            result[active[done]] = self.distance[active[done]]
            short = fall < _FALL
            self.inner[active[short]] = self.distance[active[short]]
            self.outer[active[~short]] = self.distance[active[~short]]
            closed = short & (self.distance[active] >= self.room[active])
            self._move(active, root, slope)
            outer = self.outer[active]
            narrow = ~done & np.isfinite(outer) & (outer - self.inner[active] <= _NARROW * outer)
            result[active[narrow]] = outer[narrow]
            active = active[~(done | closed | narrow)]
        return result

    def _fall(self, active: Indices) -> tuple[Array, Array]:
        """Maximise the rest and return how far p has fallen, with its slope in the distance."""
        summit, index = self.summit, self.index[active]
        rows = np.arange(len(active))
        start = self.points[active]
        start[rows, index] = summit.best[index] + self.sign[active] * self.distance[active]
        moving = np.ones(start.shape, dtype=bool)
        moving[rows, index] = False
        top = maximise(
            summit.objective, start, summit.counts, moving=moving, scale=summit.scale, tolerance=1e-8
        )
        self.points[active] = top.points
        highest = int(np.argmax(top.values))
        if top.values[highest] > self.height:
            self.highest, self.height = top.points[highest], float(top.values[highest])
        return summit.value - top.values, -self.sign[active] * top.gradients[rows, index]

    def _move(self, active: Indices, root: Array, slope: Array) -> None:
        """Go to the distance where Newton's method expects the crossing, or halve the bracket."""
        at, inner, outer = self.distance[active], self.inner[active], self.outer[active]
        room = self.room[active]
        rising = np.isfinite(root) & (slope > 0.0) & (root > 0.0)
        step = np.where(
            rising, (1.0 - root) * np.where(rising, root, 1.0) / np.where(rising, slope, 1.0), np.inf
        )
        bracketed = np.isfinite(outer)
        beyond = np.minimum(np.minimum(at + step, _LONGEST_STRIDE * at), room)
        middle = 0.5 * (inner + np.where(bracketed, outer, inner))
        inside = rising & (at + step > inner) & (at + step < outer)
        wanted = np.where(bracketed, np.where(inside, at + step, middle), beyond)
        ratio = (wanted / at)[:, None]
        self.points[active] = self.summit.best + (self.points[active] - self.summit.best) * ratio
        self.distance[active] = wanted
