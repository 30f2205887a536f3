"""An analysis as it is at another exposure, or with other counts."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import numpy.typing as npt

from workbench.errors import InputError, Problem
from workbench.hypotheses.analysis import Analysis, Exposure
from workbench.hypotheses.processes import Process

Array = npt.NDArray[np.float64]


def stated_exposure(analysis: Analysis) -> float:
    """Return the exposure that the stated yields stand for; 1 where none is declared.

    Args:
        analysis: everything declared.
    """
    return 1.0 if analysis.exposure is None else analysis.exposure.collected


def at_exposure(analysis: Analysis, exposure: float) -> Analysis:
    """Return the analysis with what it expects at another exposure, its counts as they are.

        expected(t) = expected x t/collected, where a process follows exposure

    Errors of template columns scale with their process, so that relative ones stay. Where no exposure is
    declared, it is counted in multiples of what the stated yields stand for.

    Args:
        analysis: everything declared.
        exposure: the other exposure, in the analysis' unit; > 0.

    Returns:
        The analysis, with that exposure as its own.

    Raises:
        InputError: if the exposure is no positive number.

    Source:
        none, definition
    """
    refuse_exposure(exposure)
    ratio = exposure / stated_exposure(analysis)
    if ratio == 1.0:
        return analysis
    declared = Exposure(exposure) if analysis.exposure is None else analysis.exposure
    return replace(
        analysis,
        processes=tuple(_scaled(process, ratio) for process in analysis.processes),
        exposure=replace(declared, collected=exposure),
    )


def with_counts(analysis: Analysis, counts: Array, source: str) -> Analysis:
    """Return the analysis with other observed counts.

    Args:
        analysis: everything declared.
        counts: (bin,) counts of all regions in order [events].
        source: where they come from, in words.

    Returns:
        The analysis.

    Raises:
        InputError: if a count is too large to be kept exactly.

    Source:
        none, definition
    """
    regions, start = [], 0
    for region in analysis.regions:
        stop = start + region.table.binning.number
        table = replace(region.table, observed=counts[start:stop], source=source, digest="", lines=())
        regions.append(replace(region, table=table))
        start = stop
    return replace(analysis, regions=tuple(regions))


def refuse_exposure(exposure: float) -> None:
    """Refuse an exposure that is no positive number.

    Args:
        exposure: in whatever unit.

    Raises:
        InputError: if it is not finite, or not above 0.
    """
    if not (math.isfinite(exposure) and exposure > 0.0):
        raise InputError(
            Problem(
                "An exposure that is no positive number",
                "exposure",
                f"{exposure:g}",
                "a number > 0",
                "give how much has been collected",
            )
        )


def _scaled(process: Process, ratio: float) -> Process:
    """Return the process with its yield in every region multiplied, where it follows exposure."""
    if not process.follows_exposure:
        return process
    return replace(process, factors=(*process.factors, ratio))
