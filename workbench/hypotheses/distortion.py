"""Smooth distortions: by how much, and where, a hypothesis lets its backgrounds be wrong in shape."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import Final

from workbench.hypotheses.processes import Process

DEFAULT_TERMS: Final = 3
MOST_TERMS: Final = 10  # more of them follow what is no longer smooth
LARGEST_SIZE: Final = 1.0


@dataclass(frozen=True, slots=True)
class Distortion:
    """A smooth distortion of all backgrounds of a hypothesis, region by region.

    In each region every background is multiplied, bin by bin, by
        exp( ln(1 + size)  sum over terms of z_k f_k ),   z_k ~ normal(0, 1)
    with f_1 = 1 (the level), f_2 a tilt, f_3 a bow, and so on: smooth functions of the region's axis that are
    orthogonal over the background's expected events. Each z_k is a source of its own.

    Attributes:
        size: one standard deviation of the relative distortion that a term makes, rms over the background's
            events; in (0, 1].
        terms: how many functions in each region, the level counted.
        regions: the regions distorted; None for all where a background of the hypothesis is.
    """

    size: float
    terms: int = DEFAULT_TERMS
    regions: tuple[str, ...] | None = None

    def __post_init__(self) -> None:
        if self.regions is not None:
            object.__setattr__(self, "regions", tuple(self.regions))


def regions_distorted(
    distortion: Distortion, processes: Iterable[Process], regions: Iterable[str]
) -> tuple[str, ...]:
    """Return the regions that a distortion acts in.

    Args:
        distortion: the distortion.
        processes: the processes of the hypothesis.
        regions: every region of the analysis.

    Returns:
        Region names, in the order given.

    Source:
        none, definition
    """
    filled = {name for process in processes if not process.is_signal for name in process.region_names}
    asked = filled if distortion.regions is None else filled & set(distortion.regions)
    return tuple(name for name in regions if name in asked)


def term_names(region: str, terms: int) -> tuple[str, ...]:
    """Return the names of a region's terms as sources: "distortion 1 in peak" and so on."""
    return tuple(f"distortion {place} in {region}" for place in range(1, terms + 1))
