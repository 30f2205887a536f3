"""The peak with a normal core and a power-law tail on each side."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache
from typing import ClassVar

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.counts.binning import Binning
from workbench.hypotheses.jets import Jet, compose
from workbench.hypotheses.quantities import Quantity
from workbench.hypotheses.shapes.family import (
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

    Attributes:
        mean: centre of the core.
        sd: standard deviation of the core; > 0.
        tail_low: where the lower tail begins, in sd below the mean; > 0.
        power_low: power of the lower tail; > 1.
        tail_high: where the upper tail begins, in sd above the mean; > 0.
        power_high: power of the upper tail; > 1.

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
        tails = [arguments[name] for name in TAILS]
        z = (edges.values - mean.value[..., None]) / sd.value[..., None]
        low, p_low, high, p_high = (jet.value[..., None] for jet in tails)
        right = z >= 0.0
        a, p = np.where(right, high, low), np.where(right, p_high, p_low)
        total = _beyond(np.zeros(1), low, p_low) + _beyond(np.zeros(1), high, p_high)
        value = from_tails(edges, z, _beyond(np.abs(z), a, p), total) / total
        if any(jet.moves for jet in tails):
            return _with_moving_tails(edges, z, value, total, (mean, sd, *tails))

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


def _density(z: Array, a: Array, p: Array, total: Array) -> tuple[Array, Array]:
    """Return the normalised density and its slope."""
    u = np.abs(z)
    ratio = _ratio(u, a, p)
    height = np.exp(-0.5 * np.minimum(u, a) ** 2) * ratio**-p / total
    return height, -np.sign(z) * height * np.minimum(u, a) / ratio


def _with_moving_tails(edges: Edges, z: Array, value: Array, total: Array, arguments: tuple[Jet, ...]) -> Jet:
    """Return value = C/N, C the integral over the bin and N that over the line, as a jet in all six numbers.

    f_k = (C_k - f N_k)/N,      f_kn = (C_kn - f_k N_n - f_n N_k - f N_kn)/N
    """
    unnormalised = _Pieces(edges, z, arguments)

    @cache
    def slope(k: int) -> Array:
        return np.asarray((unnormalised.slope(k) - value * unnormalised.whole_slope(k)) / total)

    def bend(k: int, n: int) -> Array:
        crossed = slope(k) * unnormalised.whole_slope(n) + slope(n) * unnormalised.whole_slope(k)
        change = unnormalised.bend(k, n) - crossed - value * unnormalised.whole_bend(k, n)
        return np.asarray(change / total)

    return compose(value, arguments, slope, bend)


class _Pieces:
    """Derivatives of the integrals over bins and line before normalisation.

    Numbers are counted mean, sd, tail_low, power_low, tail_high, power_high. An edge carries q = B(|z|) on
    the left and -B(|z|) on the right, B the integral outwards; a bin's integral is the change of q, plus N
    where the bin holds the centre.
    """

    def __init__(self, edges: Edges, z: Array, arguments: tuple[Jet, ...]) -> None:
        self.edges, self.z = edges, z
        self.inverse = 1.0 / arguments[1].value[..., None]
        low, p_low, high, p_high = (jet.value[..., None] for jet in arguments[2:])
        right = z >= 0.0
        self.side = (~right, right)
        self.sign = np.where(right, -1.0, 1.0)
        self.across = right[..., edges.high] & ~right[..., edges.low]
        self.first, self.second = _beyond_derivatives(
            np.abs(z), np.where(right, high, low), np.where(right, p_high, p_low)
        )
        centre = np.zeros(1)
        self.whole = (_beyond_derivatives(centre, low, p_low), _beyond_derivatives(centre, high, p_high))

    def whole_slope(self, k: int) -> Array | float:
        """Return dN/dk."""
        return 0.0 if k < 2 else self.whole[k // 2 - 1][0][1 + k % 2]

    def whole_bend(self, k: int, n: int) -> Array | float:
        """Return d2N/dk dn."""
        return 0.0 if k < 2 or k // 2 != n // 2 else self.whole[k // 2 - 1][1][1 + k % 2][1 + n % 2]

    def slope(self, k: int) -> Array:
        """Return dC/dk by bins."""
        if k < 2:
            at_edges = self.first[0] * self.inverse * (self.z if k else 1.0)
            return self.edges.differences(at_edges)
        at_edges = self.side[k // 2 - 1] * self.sign * self.first[1 + k % 2]
        return np.asarray(self.edges.differences(at_edges) + self.across * self.whole_slope(k))

    def bend(self, k: int, n: int) -> Array:
        """Return d2C/dk dn by bins, k <= n."""
        if n < 2:
            tilt = self.sign * self.second[0][0]
            if k == 0:
                at_edges = tilt if n == 0 else self.z * tilt - self.first[0]
            else:
                at_edges = self.z * (self.z * tilt - 2.0 * self.first[0])
            return self.edges.differences(self.inverse**2 * at_edges)
        if k < 2:
            at_edges = self.side[n // 2 - 1] * self.second[0][1 + n % 2] * self.inverse
            return self.edges.differences(at_edges * (self.z if k else 1.0))
        if k // 2 != n // 2:
            return np.zeros(self.across.shape)
        at_edges = self.side[k // 2 - 1] * self.sign * self.second[1 + k % 2][1 + n % 2]
        return np.asarray(self.edges.differences(at_edges) + self.across * self.whole_bend(k, n))


def _beyond_derivatives(u: Array, a: Array, p: Array) -> tuple[list[Array], list[list[Array]]]:
    """Return first and second derivatives of the integral outwards in u, a and p.

    Beyond the core it is B = exp(b), b = -a^2/2 + ln p - ln a - ln(p - 1) + (1 - p) ln r, with
    r = 1 + a (u - a)/p, so that B_xy = B (b_xy + b_x b_y). Inside, r stays 1 and the normal integral from u
    to a is added.
    """
    out = u > a
    r = _ratio(u, a, p)
    power_law = np.exp(-0.5 * a * a) * p / (a * (p - 1.0)) * r ** (1.0 - p)
    s = [out * one / r for one in (a / p, (u - 2.0 * a) / p, (1.0 - r) / p)]
    r_uu, r_ua, r_up = np.zeros(1), 1.0 / p, -a / p**2
    r_aa, r_ap, r_pp = -2.0 / p, -(u - 2.0 * a) / p**2, 2.0 * (r - 1.0) / p**2
    mixed = [[r_uu, r_ua, r_up], [r_ua, r_aa, r_ap], [r_up, r_ap, r_pp]]
    b = [(1.0 - p) * one for one in s]
    b[1] = b[1] - a - 1.0 / a
    b[2] = b[2] + 1.0 / p - 1.0 / (p - 1.0) - np.log(r)
    bends = [[(1.0 - p) * (out * mixed[x][y] / r - s[x] * s[y]) for y in range(3)] for x in range(3)]
    for x, y in ((0, 2), (1, 2), (2, 2)):
        bends[x][y] = bends[x][y] - s[x] * (2.0 if x == y else 1.0)
    bends[1][1] = bends[1][1] - 1.0 + 1.0 / a**2
    bends[2][2] = bends[2][2] - 1.0 / p**2 + 1.0 / (p - 1.0) ** 2
    first = [power_law * one for one in b]
    second = [[power_law * (bends[min(x, y)][max(x, y)] + b[x] * b[y]) for y in range(3)] for x in range(3)]
    core, edge = ~out * np.exp(-0.5 * u * u), ~out * np.exp(-0.5 * a * a)
    first[0], first[1] = first[0] - core, first[1] + edge
    second[0][0], second[1][1] = second[0][0] + u * core, second[1][1] - a * edge
    return first, second
