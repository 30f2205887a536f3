"""What is left out together: single bins, whole regions."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from workbench.hypotheses.analysis import Analysis

Flags = npt.NDArray[np.bool_]


@dataclass(frozen=True, slots=True, eq=False)
class Place:
    """A bin or a region.

    Attributes:
        flags: (bin,) True for its bins among those of all regions.
        region: the region's name.
        number: the bin's place in its region, counted from 1; None for a whole region.
        low, high: its range on the region's axis.
        observed: counted events [events].
    """

    flags: Flags
    region: str
    number: int | None
    low: float
    high: float
    observed: int


def bins_of(analysis: Analysis) -> list[Place]:
    """Return every bin of every region, in order."""
    found = []
    for one in regions_of(analysis):
        table = analysis.region(one.region).table
        counts = np.zeros(table.binning.number) if table.observed is None else table.observed
        for index, place in enumerate(np.flatnonzero(one.flags)):
            flags = np.arange(one.flags.size) == place
            low, high = float(table.binning.low[index]), float(table.binning.high[index])
            found.append(Place(flags, one.region, index + 1, low, high, int(counts[index])))
    return found


def regions_of(analysis: Analysis) -> list[Place]:
    """Return every region, in order."""
    return list(_regions(analysis))


def _regions(analysis: Analysis) -> Iterator[Place]:
    sizes = [region.table.binning.number for region in analysis.regions]
    owner = np.repeat(np.arange(len(sizes)), sizes)
    for index, region in enumerate(analysis.regions):
        observed = region.table.observed
        total = 0 if observed is None else int(observed.sum())
        binning = region.table.binning
        yield Place(owner == index, region.name, None, float(binning.first), float(binning.last), total)
