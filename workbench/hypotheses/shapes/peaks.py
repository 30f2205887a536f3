"""Peaks in closed form; not renormalised: the part outside the range is lost."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import ClassVar

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.counts.binning import Binning
from workbench.hypotheses.jets import Jet
from workbench.hypotheses.quantities import Quantity
from workbench.hypotheses.shapes.family import (
    AnalyticShape,
    Bounds,
    edges_of,
    from_tails,
    moved_and_stretched,
)

Array = npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Gaussian(AnalyticShape):
    """A normal peak.

    Attributes:
        mean: its centre.
        sd: its standard deviation; > 0.
    """

    family: ClassVar[str] = "gaussian"
    lower_bounds: ClassVar[Bounds] = {"sd": (0.0, True)}
    mean: Quantity
    sd: Quantity

    def integrals(self, binning: Binning, arguments: Mapping[str, Jet]) -> Jet:
        """Return the fraction of events in each bin."""
        edges, mean, sd = edges_of(binning), arguments["mean"], arguments["sd"]
        z = (edges.values - mean.value[..., None]) / sd.value[..., None]
        value = from_tails(edges, z, special.ndtr(-np.abs(z)))
        return moved_and_stretched(edges, value, z, mean, sd, _normal)


@dataclass(frozen=True, slots=True)
class BreitWigner(AnalyticShape):
    """A Lorentz peak (non-relativistic).

    Attributes:
        mean: its centre.
        width: its full width at half maximum; > 0.
    """

    family: ClassVar[str] = "breitwigner"
    lower_bounds: ClassVar[Bounds] = {"width": (0.0, True)}
    mean: Quantity
    width: Quantity

    def integrals(self, binning: Binning, arguments: Mapping[str, Jet]) -> Jet:
        """Return the fraction of events in each bin.

        The two arc tangents are subtracted by their addition theorem, which keeps the digits of narrow bins
        far away: arctan b - arctan a = angle of (1 + a b, b - a) for b > a.
        """
        edges, mean, half = edges_of(binning), arguments["mean"], arguments["width"] * 0.5
        z = (edges.values - mean.value[..., None]) / half.value[..., None]
        widths = (binning.high - binning.low) / half.value[..., None]
        value = np.arctan2(widths, 1.0 + z[..., edges.low] * z[..., edges.high]) / np.pi
        return moved_and_stretched(edges, value, z, mean, half, _lorentz)


def _normal(z: Array) -> tuple[Array, Array]:
    """Return the standard normal density and its slope."""
    density = np.exp(-0.5 * z * z) / np.sqrt(2.0 * np.pi)
    return density, -z * density


def _lorentz(z: Array) -> tuple[Array, Array]:
    """Return the Lorentz density of half width 1 and its slope."""
    weight = 1.0 / (1.0 + z * z)
    return weight / np.pi, -2.0 / np.pi * z * weight * weight
