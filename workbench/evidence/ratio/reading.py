"""The updating ratio read along one parameter, or over two, for screens and pictures."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from workbench.evidence.ratio.results import Scan
from workbench.evidence.ratio.surface import Surface, product

Array = npt.NDArray[np.float64]

_STEPS = 10  # between strength nodes
_A_NODE, _FEWEST, _MOST, _ROWS = 3, 241, 1201, 161  # of a sheet
_MOST_POINTS = 60_000
_BELOW_PEAK = 9.2103403719761836  # ln 10^4
_BELOW_SHOWN = 13.815510557964274  # ln 10^6


@dataclass(frozen=True, slots=True, eq=False)
class Profile:
    """R along one parameter; where there are others, at the values of them at which it is largest.

    Attributes:
        parameter: along what.
        values: (point,) its values, ascending.
        ln_ratio, error: (point,) ln R and its error [nats].
        others: each other parameter's (point,) values there.
    """

    parameter: str
    values: Array
    ln_ratio: Array
    error: Array
    others: Mapping[str, Array]


@dataclass(frozen=True, slots=True, eq=False)
class Sheet:
    """R over two parameters.

    Attributes:
        across, up: the parameters.
        x, y: (column,) and (row,) their values.
        ln_ratio: (row, column) ln R [nats].
    """

    across: str
    up: str
    x: Array
    y: Array
    ln_ratio: Array


def main_parameter(found: Scan) -> str:
    """Return the parameter that a screen runs along: the first that is no strength with nodes of its own."""
    names = found.known.names
    return next((name for name in found.over if name != names[-1]), names[-1])


def shown_values(found: Scan, number: int) -> Array:
    """Return evenly spaced values of the main parameter and its peak: what a reader wants to see.

    A mass is shown over its whole range, a strength as far up as R is above 10^-6 of 1 or of its peak.

    Args:
        found: a scan.
        number: how many values, the peak not counted.
    """
    surface, along = found.known, main_parameter(found)
    low, high = surface.ranges[along]
    top = found.peak[0][along]
    if surface.strengths is not None and along == surface.strengths.name:
        nodes, ln_ratio = surface.strengths.nodes[0], surface.ln_ratio[0]
        seen = nodes[ln_ratio > min(float(ln_ratio.max()), 0.0) - _BELOW_SHOWN]
        high = min(high, max(float(seen.max()), 1.5 * top))
    return np.unique(np.append(np.linspace(low, high, number), top))


def profile(found: Scan, values: Array) -> Profile:
    """Return R along the main parameter.

    Args:
        found: a scan.
        values: (point,) values inside its range.
    """
    surface = found.known
    along = main_parameter(found)
    place = surface.names.index(along)
    if len(surface.names) == 1:
        ln_ratio, error = surface.at(values[:, None])
        return Profile(along, values, ln_ratio, error, {})
    points = np.repeat(_others(found, along)[None], len(values), axis=0)
    points[:, :, place] = values[:, None]
    flat = points.reshape(-1, len(surface.names))
    read = _read(surface, flat).reshape(points.shape[:2])
    best = points[np.arange(len(values)), np.argmax(read, axis=1)]
    ln_ratio, error = surface.at(best)
    others = {name: best[:, k] for k, name in enumerate(surface.names) if k != place}
    return Profile(along, values, ln_ratio, error, others)


def _others(found: Scan, along: str) -> Array:
    """Return (point, parameter) values of the other parameters to look for the largest R at."""
    surface = found.known
    nodes = [np.zeros(1) if one.name == along else one.nodes for one in surface.panels]
    if surface.strengths is None:
        return product(nodes)
    top = int(np.argmax(surface.ln_ratio.max(axis=1)))
    ranges = [surface.strengths.refined(_STEPS)[top]]
    if along == surface.strengths.name:
        ranges = [np.zeros(1)]
    return product([*nodes, *ranges])


def sheet(found: Scan) -> Sheet:
    """Return R over two parameters, the strength as far up as R is above 10^-4 of its peak somewhere.

    Args:
        found: a scan over two parameters.
    """
    surface = found.known
    across = main_parameter(found)
    up = next(name for name in found.over if name != across)
    low, high = surface.ranges[up]
    if surface.strengths is not None and up == surface.strengths.name:
        is_high = surface.ln_ratio > surface.ln_ratio.max() - _BELOW_PEAK
        is_high |= surface.ln_ratio > -_BELOW_PEAK
        high = min(high, 1.1 * float(surface.strengths.nodes[is_high].max()))
    finest = max((one.nodes.size for one in surface.panels if one.name == across), default=0)
    x = np.linspace(*surface.ranges[across], int(np.clip(_A_NODE * finest, _FEWEST, _MOST)))
    y = np.linspace(low, high, _ROWS)
    grid = np.stack(np.meshgrid(x, y), axis=2).reshape(-1, 2)
    order = [0, 1] if surface.names[0] == across else [1, 0]
    return Sheet(across, up, x, y, _read(surface, grid[:, order]).reshape(y.size, x.size))


def _read(surface: Surface, points: Array) -> Array:
    """Return (point,) ln R, so many points at once that memory stays bounded."""
    pieces = range(0, len(points), _MOST_POINTS)
    return np.concatenate([surface.at(points[first : first + _MOST_POINTS])[0] for first in pieces])
