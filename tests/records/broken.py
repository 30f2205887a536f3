"""Break points built by hand, for screens, records and pictures."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from tests.records import hand_built as hand
from workbench.evidence.breaking.results import Breaking, BreakPoint, Distorted
from workbench.records.outcomes import BreakPointOutcome


def break_point() -> BreakPoint:
    """Return a break point of three terms in the one region of the hand-built analysis."""
    region = hand.analysis().regions[0]
    place = np.linspace(-1.0, 1.0, region.table.binning.number)
    distorted = Distorted(
        region.name,
        (0.01, 0.04, -0.02),
        np.expm1(0.01 + 0.04 * place),
        100.0 * np.exp(-place),
        10.0 * np.exp(-0.5 * (place / 0.1) ** 2),
    )
    return BreakPoint(
        "resonance",
        "background only",
        3.0,
        0.3,
        3,
        Breaking.FOUND,
        "",
        7.715,
        0.011,
        under_peak=0.0312,
        under_peak_error=0.0004,
        rms=0.0268,
        rms_error=0.0003,
        reached=3.004,
        reached_error=0.008,
        stated_before=0.104,
        stated_after=0.0171,
        distorted=(distorted,),
        evidences=11,
    )


def outcome(found: BreakPoint | None = None) -> BreakPointOutcome:
    """Return what `breakpoint` found."""
    given = hand.weighed()
    return BreakPointOutcome(given.analysis, given.origin, break_point() if found is None else found)


def not_within() -> BreakPoint:
    """Return a search that ended at its range."""
    given = replace(break_point(), ending=Breaking.NOT_WITHIN, within=0.05, reached=5.21)
    return replace(given, under_peak=None, under_peak_error=None, rms=None, rms_error=None)


def below_already() -> BreakPoint:
    """Return a question whose answer is that there is nothing to break."""
    given = replace(not_within(), ending=Breaking.BELOW_ALREADY, below=9.0, distorted=(), evidences=1)
    return replace(given, reached=None, reached_error=None)


def not_established() -> BreakPoint:
    """Return a search without an evidence to start from."""
    return BreakPoint(
        "resonance",
        "background only",
        3.0,
        0.3,
        3,
        Breaking.NOT_ESTABLISHED,
        '"resonance": the sampling error of 0.31 is above 0.1',
        None,
        None,
    )


def not_settled() -> BreakPoint:
    """Return a search that ran out of steps."""
    reason = '"resonance": no end within 43 pairs of evidences; ask for a smaller range'
    given = replace(below_already(), ending=Breaking.NOT_SETTLED, below=3.0, reason=reason)
    return replace(given, evidences=43)
