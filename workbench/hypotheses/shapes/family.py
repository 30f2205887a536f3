"""What the analytic shapes share: their quantities, edges, and the peak that is moved and stretched."""

from __future__ import annotations

from abc import ABC, abstractmethod
from collections.abc import Callable, Mapping
from dataclasses import dataclass, fields
from typing import ClassVar

import numpy as np
import numpy.typing as npt

from workbench.counts.binning import Binning
from workbench.hypotheses.jets import Jet, compose
from workbench.hypotheses.quantities import Quantity

Array = npt.NDArray[np.float64]
Bounds = Mapping[str, tuple[float, bool]]


class AnalyticShape(ABC):
    """A shape given by a formula.

    Attributes:
        family: the shape's name in the analysis file.
        lower_bounds: field name to (bound, True where the bound itself is excluded).
    """

    __slots__ = ()
    family: ClassVar[str]
    lower_bounds: ClassVar[Bounds] = {}

    @property
    def quantities(self) -> dict[str, Quantity]:
        """Return what stands for each of the shape's numbers, by field name."""
        return {field.name: getattr(self, field.name) for field in fields(self)}  # type: ignore[arg-type]

    @abstractmethod
    def integrals(self, binning: Binning, arguments: Mapping[str, Jet]) -> Jet:
        """Return the fraction of the process' events in each bin, with exact derivatives.

        Args:
            binning: the region's bins.
            arguments: the keys of `quantities` to jets (...) without bin axis.

        Returns:
            (..., bin) the density's integral over each bin, in the arguments' variables.

        Source:
            None, definition of the family's density.
        """


@dataclass(frozen=True, slots=True, eq=False)
class Edges:
    """All edges of a binning once, and where each bin finds its two.

    Attributes:
        values: (edge,) edges; those of touching bins are not repeated.
        low: where the lower edges are.
        high: where the upper edges are.
    """

    values: Array
    low: slice
    high: slice

    def differences(self, at_edges: Array) -> Array:
        """Return upper minus lower: (..., edge) to (..., bin)."""
        change: Array = at_edges[..., self.high] - at_edges[..., self.low]
        return change


def edges_of(binning: Binning) -> Edges:
    """Return the edges of a binning, each once where the bins touch.

    Args:
        binning: the region's bins.

    Returns:
        The edges.

    Source:
        None, definition.
    """
    number = binning.number
    if np.array_equal(binning.low[1:], binning.high[:-1]):
        values = np.append(binning.low, binning.high[-1])
        return Edges(values, slice(0, number), slice(1, number + 1))
    values = np.concatenate([binning.low, binning.high])
    return Edges(values, slice(0, number), slice(number, 2 * number))


def from_tails(edges: Edges, z: Array, tail: Array, total: float | Array = 1.0) -> Array:
    """Return bin integrals from the tails beyond the edges, without cancellation on either side.

    Args:
        edges: the edges.
        z: (..., edge) distance from the centre; its sign tells the side.
        tail: (..., edge) integral from the edge outwards, away from the centre.
        total: integral over the whole line.

    Returns:
        (..., bin) integrals.

    Source:
        None, definition: bins right of the centre are differences of right tails, bins left of it of left
        tails, the bin across it is the total less both.
    """
    right = z >= 0.0
    signed = np.where(right, -tail, tail)
    across = right[..., edges.high] & ~right[..., edges.low]
    change: Array = edges.differences(signed) + across * total
    return change


def moved_and_stretched(
    edges: Edges,
    value: Array,
    z: Array,
    centre: Jet,
    scale: Jet,
    density: Callable[[Array], tuple[Array, Array]],
) -> Jet:
    """Return bin integrals of a density of z = (x - centre)/scale as a jet.

    With F the distribution function, f its density, f' the density's slope, at each edge:
        dF/dc = -f/s,          dF/ds = -z f/s,
        d2F/dc2 = f'/s^2,      d2F/dc ds = (f + z f')/s^2,      d2F/ds2 = (2 z f + z^2 f')/s^2

    Args:
        edges: the edges.
        value: (..., bin) bin integrals.
        z: (..., edge) the edges in units of the scale.
        centre: (...) the centre.
        scale: (...) the scale; > 0.
        density: z to f(z), f'(z); not called where nothing moves.

    Returns:
        (..., bin) the integrals.

    Source:
        None, definition (chain rule).
    """
    if not (centre.moves or scale.moves):
        return compose(value, (centre, scale), _unused, _unused)
    inverse = 1.0 / scale.value[..., None]
    height, tilt = density(z)

    def slope(k: int) -> Array:
        return -inverse * edges.differences(height if k == 0 else z * height)

    def bend(k: int, n: int) -> Array:
        if n == 0:
            at_edges = tilt
        elif k == 0:
            at_edges = height + z * tilt
        else:
            at_edges = z * (2.0 * height + z * tilt)
        return inverse**2 * edges.differences(at_edges)

    return compose(value, (centre, scale), slope, bend)


def _unused(*_: int) -> Array:
    raise AssertionError("no derivative is asked of what does not move")
