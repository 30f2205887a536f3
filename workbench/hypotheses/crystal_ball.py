"""The peak with a normal core and a power-law tail on each side."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import ClassVar

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.counts.binning import Binning
from workbench.hypotheses.jets import Jet, choose
from workbench.hypotheses.quantities import Quantity
from workbench.hypotheses.shape_family import (
    AnalyticShape,
    Bounds,
    Edges,
    edges_of,
    from_tails,
    moved_and_stretched,
)

Array = npt.NDArray[np.float64]

ROOT_TWO_PI = float(np.sqrt(2.0 * np.pi))
TAILS = ("tail_low", "power_low", "tail_high", "power_high")


@dataclass(frozen=True, slots=True)
class CrystalBall(AnalyticShape):
    """A normal core between -tail_low and tail_high standard deviations, power laws beyond.

    With t = (x - mean)/sd and a, p the tail and power of a side, the density is proportional to exp(-t^2/2)
    up to |t| = a, and beyond to (p/a)^p exp(-a^2/2) (p/a - a + |t|)^-p, which continues value and slope.

    Source:
        J. E. Gaiser, PhD thesis, SLAC-R-255 (1982), appendix F, with a tail on both sides; from memory.
    """

    family: ClassVar[str] = "crystalball"
    lower_bounds: ClassVar[Bounds] = {
        "sd": (0.0, True),
        "tail_low": (0.0, True),
        "power_low": (1.0, True),
        "tail_high": (0.0, True),
        "power_high": (1.0, True),
    }
    mean: Quantity
    sd: Quantity
    tail_low: Quantity
    power_low: Quantity
    tail_high: Quantity
    power_high: Quantity

    def integrals(self, binning: Binning, arguments: Mapping[str, Jet]) -> Jet:
        """Return the fraction of events in each bin."""
        edges, mean, sd = edges_of(binning), arguments["mean"], arguments["sd"]
        low, p_low, high, p_high = (arguments[name] for name in TAILS)
        if any(jet.moves for jet in (low, p_low, high, p_high)):
            return _with_moving_tails(edges, mean, sd, (low, p_low), (high, p_high))
        z = (edges.values - mean.value[..., None]) / sd.value[..., None]
        right = z >= 0.0
        a, p = (
            np.where(right, above.value[..., None], below.value[..., None])
            for above, below in ((high, low), (p_high, p_low))
        )
        beyond, total = _beyond(np.abs(z), a, p), _total(low, p_low, high, p_high)
        value = from_tails(edges, z, beyond, total) / total

        def density(z: Array) -> tuple[Array, Array]:
            return _density(z, a, p, total)

        return moved_and_stretched(edges, value, z, mean, sd, density)


def _ratio(u: Array, a: Array, p: Array) -> Array:
    """Return 1 + a (u - a)/p beyond the core and 1 inside."""
    ratio: Array = 1.0 + a * np.maximum(u - a, 0.0) / p
    return ratio


def _beyond(u: Array, a: Array, p: Array) -> Array:
    """Return the integral from u >= 0 outwards of one side."""
    power_law = np.exp(-0.5 * a * a) * p / (a * (p - 1.0)) * _ratio(u, a, p) ** (1.0 - p)
    core = ROOT_TWO_PI * (special.ndtr(-np.minimum(u, a)) - special.ndtr(-a))
    beyond: Array = power_law + core
    return beyond


def _total(low: Jet, p_low: Jet, high: Jet, p_high: Jet) -> Array:
    zero = np.zeros(())
    total = _beyond(zero, low.value, p_low.value) + _beyond(zero, high.value, p_high.value)
    return np.asarray(total)[..., None]


def _density(z: Array, a: Array, p: Array, total: Array) -> tuple[Array, Array]:
    """Return the normalised density and its slope."""
    u = np.abs(z)
    ratio = _ratio(u, a, p)
    height = np.exp(-0.5 * np.minimum(u, a) ** 2) * ratio**-p / total
    return height, -np.sign(z) * height * np.minimum(u, a) / ratio


def _with_moving_tails(
    edges: Edges, mean: Jet, sd: Jet, below: tuple[Jet, Jet], above: tuple[Jet, Jet]
) -> Jet:
    """Return the integrals where a tail moves too, by arithmetic on jets."""
    z = (edges.values - mean.over_bins()) / sd.over_bins()
    right = z.value >= 0.0
    a, p = (choose(right, above[k].over_bins(), below[k].over_bins()) for k in (0, 1))
    beyond = _beyond_jet(choose(right, z, -z), a, p)
    zero = Jet.constant(np.zeros(1), z.variables)
    total = zero
    for tail, power in (below, above):
        total = total + _beyond_jet(zero, tail.over_bins(), power.over_bins())
    signed = choose(right, -beyond, beyond)
    across = right[..., edges.high] & ~right[..., edges.low]
    return (_at(signed, edges.high) - _at(signed, edges.low) + total * across.astype(float)) / total


def _at(jet: Jet, bins: slice) -> Jet:
    return Jet(jet.value[..., bins], jet.first[..., bins], jet.second[..., bins])


def _beyond_jet(u: Jet, a: Jet, p: Jet) -> Jet:
    """Return the integral from u >= 0 outwards of one side."""
    in_tail = u.value > a.value
    ratio = choose(in_tail, (u - a) * a / p + 1.0, Jet.constant(np.ones(1), a.variables))
    whole_tail = (a * a * -0.5).exp() * p / (a * (p - 1.0))
    power_law = whole_tail * ((1.0 - p) * ratio.log()).exp()
    core = ((-choose(in_tail, a, u)).normal_cdf() - (-a).normal_cdf()) * ROOT_TWO_PI
    return power_law + core
