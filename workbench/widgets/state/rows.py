"""Uncertainties as a list: one row for each source and process that it acts on."""

from __future__ import annotations

from dataclasses import dataclass

from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.effects import regions_acted_on
from workbench.hypotheses.faults import KeyPath
from workbench.hypotheses.uncertainties import Effect, Uncertainty

Size = float | str


@dataclass(frozen=True, slots=True)
class Row:
    """What one source does to one process.

    Attributes:
        source, process: their names.
        up: relative change at one standard deviation, 0.10 for ten per cent; or a template column.
        down: the same at minus one; None where one number says both.
        regions: the regions that it is limited to; None for all of the process' regions.
    """

    source: str
    process: str
    up: Size
    down: Size | None = None
    regions: tuple[str, ...] | None = None

    @property
    def control(self) -> KeyPath:
        """Return the key that the row stands for."""
        path = ("uncertainties", self.source, "effects", self.process)
        return path if self.regions is None else (*path, "regions", *self.regions)

    @property
    def has_effect(self) -> bool:
        """Say whether it changes anything."""
        return bool(self.up) or bool(self.down)


def rows_of(analysis: Analysis) -> tuple[Row, ...]:
    """Return the list of uncertainties, in declaration order; pairs without effect are left out.

    The exposure's uncertainty, which has no effects of its own to choose, is not in it.

    Args:
        analysis: the analysis.

    Returns:
        The rows; what one source does alike to one process in several regions is one of them.

    Source:
        none, definition
    """
    return tuple(
        row for source in analysis.uncertainties for row in placed_rows(source, analysis) if row.has_effect
    )


def placed_rows(source: Uncertainty, analysis: Analysis) -> dict[Row, tuple[int, ...]]:
    """Return a source's rows, each with the places of its effects in the source's list."""
    places: dict[tuple[object, ...], list[int]] = {}
    for place, effect in enumerate(source.effects):
        is_limited = effect.regions is not None
        alike = (effect.process, repr(effect.up), repr(effect.down), is_limited)
        places.setdefault(alike, []).append(place)
    return {_row(source, [source.effects[one] for one in at], analysis): tuple(at) for at in places.values()}


def _row(source: Uncertainty, effects: list[Effect], analysis: Analysis) -> Row:
    first = effects[0]
    regions: tuple[str, ...] | None = None
    if first.regions is not None:
        regions = tuple(name for effect in effects for name in effect.regions or ())
    elif source.regions is not None:
        regions = regions_acted_on(first, source, analysis.process(first.process))
    return Row(source.name, first.process, first.up, first.down, regions)
