"""What was understood of the tables of an analysis: totals, empty bins, and which column is what."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from workbench.counts.region import Region
from workbench.counts.table import BIN_COLUMNS, ERROR_ENDING
from workbench.hypotheses.analysis import Analysis
from workbench.records.descriptions import column_uses


@dataclass(frozen=True, slots=True)
class Column:
    """One column of a region's table.

    Attributes:
        name: as the table heads it.
        meaning: what it is taken for.
        total: the sum of its numbers [events]; None where a sum means nothing.
        used_by: who uses it: processes, and sources with their side.
    """

    name: str
    meaning: str
    total: float | None = None
    used_by: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Understood:
    """What was understood of a region.

    Attributes:
        name, observable, unit: of the region.
        source: the table's file, or a description of where it comes from.
        bins, first_edge, last_edge: the bins and their range.
        has_gaps: whether some of the range lies in no bin.
        observed: all observed counts [events]; None when planning.
        empty_bins, single_count_bins: bins with a count of 0 and of 1; None when planning.
        template_errors: whether error columns enter the likelihood.
        columns: every column, the bins' first.
    """

    name: str
    observable: str
    unit: str
    source: str
    bins: int
    first_edge: float
    last_edge: float
    has_gaps: bool
    observed: int | None
    empty_bins: int | None
    single_count_bins: int | None
    template_errors: bool
    columns: tuple[Column, ...]

    @property
    def templates(self) -> tuple[Column, ...]:
        """Return the template columns."""
        return tuple(one for one in self.columns if one.meaning == TEMPLATE)


EDGES = ("the bin's lower edge", "the bin's upper edge")
OBSERVED = "observed counts"
TEMPLATE = "a template's expected events"


def understood(analysis: Analysis) -> tuple[Understood, ...]:
    """Return what was understood of each region's table, before anything is computed.

    Args:
        analysis: the analysis.

    Returns:
        One for each region, in their order.

    Source:
        none, definition
    """
    return tuple(_understood(analysis, region) for region in analysis.regions)


def _understood(analysis: Analysis, region: Region) -> Understood:
    table, binning = region.table, region.table.binning
    observed = table.observed
    return Understood(
        name=region.name,
        observable=region.observable,
        unit=region.unit,
        source=table.source,
        bins=binning.number,
        first_edge=binning.first,
        last_edge=binning.last,
        has_gaps=not np.array_equal(binning.low[1:], binning.high[:-1]),
        observed=None if observed is None else int(observed.sum()),
        empty_bins=None if observed is None else int(np.sum(observed == 0)),
        single_count_bins=None if observed is None else int(np.sum(observed == 1)),
        template_errors=bool(region.template_errors),
        columns=_columns(analysis, region),
    )


def _columns(analysis: Analysis, region: Region) -> tuple[Column, ...]:
    table, uses = region.table, column_uses(analysis, region.name)
    low, high, counted = BIN_COLUMNS
    columns = [Column(low, EDGES[0]), Column(high, EDGES[1])]
    if table.observed is not None:
        columns.append(Column(counted, OBSERVED, float(table.observed.sum())))
    for name, values in table.columns.items():
        columns.append(Column(name, TEMPLATE, float(values.sum()), tuple(uses[name])))
    taken = "which enters the likelihood" if region.template_errors else "which is not used"
    columns += [Column(name + ERROR_ENDING, f"the error of {name}, {taken}") for name in table.errors]
    return tuple(columns)
