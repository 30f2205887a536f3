"""The same analysis with less to say: every expectation and every count scaled down together."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from workbench.counts.region import Region
from workbench.hypotheses.analysis import Analysis


def annealed(analysis: Analysis, power: float) -> Analysis:
    """Return the analysis whose likelihood at scaled counts is the likelihood to a power.

    Poisson, with the counts scaled as well:
        ln P(b n | b v) = b ln P(n | v) + terms without v
    and of the negative binomial, whose shape A = T^2/V is scaled too, to leading order.

    Args:
        analysis: everything declared.
        power: b; in (0, 1].

    Returns:
        The analysis with every process' yield times b and every template's variance times b. Its observed
        counts are as they were: counts times b are no whole numbers and are handed to the engine beside it.

    Source:
        None, definition.
    """
    processes = tuple(replace(one, factors=(*one.factors, float(power))) for one in analysis.processes)
    regions = tuple(_annealed(region, power) for region in analysis.regions)
    return replace(analysis, processes=processes, regions=regions)


def _annealed(region: Region, power: float) -> Region:
    """Return a region whose relative template errors grow as its counts shrink."""
    events = region.empty_bin_events
    errors = {name: values / np.sqrt(power) for name, values in region.table.errors.items()}
    return replace(
        region,
        table=replace(region.table, errors=errors, digest=""),
        empty_bin_events=None if events is None else power * events,
    )
