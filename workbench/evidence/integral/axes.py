"""Panels along a signal coordinate: even steps of what the counts tell apart, finer where something peaks.

An axis is laid out in prior probability p in [0, 1], x = F^-1(p), so that a prior average is a plain integral
over p.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.evidence.integral.search import Landscape, signal_events
from workbench.likelihood.model import Model

Array = npt.NDArray[np.float64]
Indices = npt.NDArray[np.intp]

KRONROD_NODES = np.array(
    [
        -0.9604912687080202,
        -0.7745966692414834,
        -0.4342437493468025,
        0.0,
        0.4342437493468025,
        0.7745966692414834,
        0.9604912687080202,
    ]
)
KRONROD_WEIGHTS = np.array(
    [
        0.1046562260264673,
        0.2684880898683334,
        0.4013974147759622,
        0.4509165386584741,
        0.4013974147759622,
        0.2684880898683334,
        0.1046562260264673,
    ]
)
GAUSS_WEIGHTS = np.array([0.0, 5.0 / 9.0, 0.0, 8.0 / 9.0, 0.0, 5.0 / 9.0, 0.0])

_PANEL_ANGLE = 2.4
_FINEST = 0.35
_FIRST_GRID = 400
_LARGEST_GRID = 20_000
_SHORTEST = 1e-5
_FARTHEST = 6.0  # standard deviations of a normal prior: one part in a thousand million lies beyond
_TAIL, _STILL, _FALL = 2.0, 0.3, 0.6  # deviations; radians a deviation; radians for a fall by e


@dataclass(frozen=True, slots=True, eq=False)
class Axis:
    """Nodes of a composite seven-point rule along one signal coordinate.

    Attributes:
        edges: (panel + 1,) panel ends in prior probability.
    """

    edges: Array

    @property
    def nodes(self) -> Array:
        """Return (node,) positions in prior probability, ascending."""
        middle, half = self._panels()
        return np.asarray((middle[:, None] + half[:, None] * KRONROD_NODES).ravel())

    @property
    def weights(self) -> Array:
        """Return (node,) weights of the seven-point rule."""
        return np.asarray((self._panels()[1][:, None] * KRONROD_WEIGHTS).ravel())

    @property
    def coarse_weights(self) -> Array:
        """Return (node,) weights of the three-point rule within it, for the error."""
        return np.asarray((self._panels()[1][:, None] * GAUSS_WEIGHTS).ravel())

    def _panels(self) -> tuple[Array, Array]:
        return 0.5 * (self.edges[1:] + self.edges[:-1]), 0.5 * np.diff(self.edges)

    def split(self, panels: Indices) -> Axis:
        """Return the axis with the given panels cut in half."""
        middle = self._panels()[0][panels]
        return Axis(np.sort(np.concatenate([self.edges, middle])))


def standard(p: Array) -> Array:
    """Return standard-normal coordinates of prior probabilities, exact in both tails as far as p is."""
    return np.asarray(special.ndtri(np.clip(p, 1e-300, 1.0 - 1e-16)))


def lay_out(model: Model, landscape: Landscape, axis: int, axes: tuple[int, ...]) -> Axis:
    """Return panels of equal length in the angle between neighbouring signals.

    Signals a and b, as vectors of events weighted by the counts' inverse variance, are told apart by the
    angle between them. A peak of resolution s turns by 1/(sqrt 2 s) per unit of mass, so that a panel of 2.4
    spans about 3.4 resolutions and has at least two nodes a resolution.

    Args:
        model: a hypothesis with signal coordinates.
        landscape: the background's mode, whose variances weigh the bins.
        axis: coordinate index of this axis.
        axes: coordinate indices of all axes laid out, this one among them.

    Returns:
        The axis.
    """
    levels = (0.0,) if len(axes) == 1 else (-1.5, 0.0, 1.5)
    body = special.ndtri(np.linspace(0.0, 1.0, _FIRST_GRID + 1)[1:-1])
    tails = np.linspace(-_FARTHEST, _FARTHEST, 4 * int(_FARTHEST) + 1)
    grid = np.unique(np.concatenate([body, tails]))
    events = [_signals(model, landscape, axis, grid, level) for level in levels]
    turned = _turned(events)
    while turned.max() > _FINEST and grid.size < _LARGEST_GRID:
        wide = np.flatnonzero((turned > _FINEST) & (np.diff(grid) > _SHORTEST))
        if wide.size == 0:
            break
        between = 0.5 * (grid[wide] + grid[wide + 1])
        more = [_signals(model, landscape, axis, between, level) for level in levels]
        grid = np.concatenate([grid, between])
        order = np.argsort(grid)
        grid = grid[order]
        events = [np.concatenate([old, new])[order] for old, new in zip(events, more, strict=True)]
        turned = _turned(events)
    length = np.concatenate([[0.0], np.cumsum(turned + _thinning(grid, turned))])
    panels = max(2, int(np.ceil(length[-1] / _PANEL_ANGLE)))
    if length[-1] <= 0.0:
        return Axis(np.linspace(0.0, 1.0, panels + 1))
    inner = special.ndtr(np.interp(np.linspace(0.0, length[-1], panels + 1), length, grid))
    inner[0], inner[-1] = 0.0, 1.0
    return Axis(np.unique(inner))


def _thinning(grid: Array, turned: Array) -> Array:
    """Return what the prior's own fall adds to each interval's length, where signals still turn in its tail.

    Far out the prior falls by e within 1/|t|: nodes even in prior probability would stand at the near end of
    a panel only, and miss what the counts make of its far end.
    """
    width = np.diff(grid)
    middle = np.abs(0.5 * (grid[1:] + grid[:-1]))
    return np.where((middle > _TAIL) & (turned > _STILL * width), _FALL * middle * width, 0.0)


def _signals(model: Model, landscape: Landscape, axis: int, places: Array, level: float) -> Array:
    """Return (place, bin) events of a signal along an axis, in units of the counts' errors.

    The other shape coordinates are at one level, the other strengths at their median.
    """
    points = np.full((places.size, model.signal.size), level)
    points[:, model.signal == axis] = places[:, None]
    strengths = [model.coordinates[index].is_strength for index in model.signal]
    points[:, np.array(strengths) & (model.signal != axis)] = 0.0
    return signal_events(model, landscape, points) * np.sqrt(landscape.weight)


def _turned(events: list[Array]) -> Array:
    """Return the angle across each grid interval, the largest over (grid, bin) signals of several levels."""
    return np.asarray(np.max([_angles(one) for one in events], axis=0))


def _angles(events: Array) -> Array:
    size = np.maximum(np.linalg.norm(events, axis=1), 1e-12)
    unit = events / size[:, None]
    chord = np.linalg.norm(np.diff(unit, axis=0), axis=1)
    relative = size > 1e-6 * size.max()
    seen = relative[1:] & relative[:-1]
    return np.where(seen, 2.0 * np.arcsin(np.minimum(0.5 * chord, 1.0)), 0.0)
