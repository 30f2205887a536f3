"""Edits of the list of uncertainties: rows added, changed and taken away, sources renamed.

What is not touched keeps its place and its form, so that a file keeps its lines and comments.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

from workbench.errors import InputError, Problem, quoted
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.effects import regions_acted_on
from workbench.hypotheses.faults import KeyPath, dotted, shown
from workbench.hypotheses.uncertainties import Effect, Uncertainty
from workbench.widgets.state.rows import Row, placed_rows

NEW_ROW: KeyPath = ("uncertainties",)


class RowGoneError(InputError):
    """A row that an edit starts from is not in the list: another edit has changed it or taken it away."""


@dataclass(frozen=True, slots=True)
class RowAdded:
    """A new row, of a source that is there or of a new one.

    Attributes:
        row: what it says.
    """

    row: Row

    @property
    def control(self) -> KeyPath:
        """Return the key of the list."""
        return NEW_ROW

    @property
    def words(self) -> str:
        """Return what is changed."""
        return f"the new row {self.row.source} on {self.row.process}"

    def made(self, analysis: Analysis) -> Analysis:
        """Return the analysis with the row, last of its source."""
        _refuse_nothing(self.row)
        if not self.row.has_effect:
            raise InputError(
                Problem(
                    "A row without effect",
                    dotted(self.row.control),
                    shown(self.row.up),
                    "a size other than 0: 0.10 is ten per cent",
                    "write the size, or leave the row out",
                )
            )
        return replace(analysis, uncertainties=_added(analysis, analysis.uncertainties, self.row))


@dataclass(frozen=True, slots=True)
class RowChanged:
    """A row that says something else; one without effect is taken away.

    Attributes:
        before: the row as it stands in the list.
        after: what it shall say.
    """

    before: Row
    after: Row

    @property
    def control(self) -> KeyPath:
        """Return the key of the row as it stands in the list."""
        return self.before.control

    @property
    def words(self) -> str:
        """Return what is changed."""
        return f"{self.before.source} on {self.before.process}"

    def made(self, analysis: Analysis) -> Analysis:
        """Return the analysis with the row changed, in its place where source and process stay."""
        before, after = self.before, self.after
        _refuse_nothing(after)
        if not after.has_effect:
            return RowRemoved(before).made(analysis)
        if (before.source, before.process) != (after.source, after.process):
            without = _removed(analysis, analysis.uncertainties, before)
            return replace(analysis, uncertainties=_added(analysis, without, after))
        source, places = _placed(before, analysis)
        if before.regions == after.regions:
            changed = {at: replace(source.effects[at], up=after.up, down=after.down) for at in places}
        else:
            source = _reaching(source, after, analysis)
            changed = {places[0]: Effect(after.process, after.up, after.down, after.regions)}
        effects = tuple(
            changed.get(at, effect)
            for at, effect in enumerate(source.effects)
            if at in changed or at not in places
        )
        return replace(
            analysis, uncertainties=_with(analysis.uncertainties, replace(source, effects=effects))
        )


@dataclass(frozen=True, slots=True)
class RowRemoved:
    """A row taken away; a source without rows goes with its last.

    Attributes:
        row: the row as it stands in the list.
    """

    row: Row

    @property
    def control(self) -> KeyPath:
        """Return the key of the row."""
        return self.row.control

    @property
    def words(self) -> str:
        """Return what is changed."""
        return f"taking away {self.row.source} on {self.row.process}"

    def made(self, analysis: Analysis) -> Analysis:
        """Return the analysis without the row."""
        return replace(analysis, uncertainties=_removed(analysis, analysis.uncertainties, self.row))


@dataclass(frozen=True, slots=True)
class SourceRenamed:
    """Another name for a source, in all its rows.

    Attributes:
        before, after: the names.
    """

    before: str
    after: str

    @property
    def control(self) -> KeyPath:
        """Return the key of the source."""
        return ("uncertainties", self.before)

    @property
    def words(self) -> str:
        """Return what is changed."""
        return f"the name of {self.before}"

    def made(self, analysis: Analysis) -> Analysis:
        """Return the analysis with the source renamed, in its place."""
        renamed = replace(analysis.uncertainty(self.before), name=self.after)
        sources = tuple(renamed if one.name == self.before else one for one in analysis.uncertainties)
        return replace(analysis, uncertainties=sources)


def _refuse_nothing(row: Row) -> None:
    if row.regions == ():
        raise InputError(
            Problem(
                "An uncertainty limited to no region",
                dotted(row.control),
                "[]",
                "at least one region",
                "name a region, or leave regions out for all",
            )
        )


def _placed(row: Row, analysis: Analysis) -> tuple[Uncertainty, tuple[int, ...]]:
    """Return a row's source, and the places of the row's effects in it; or raise that it is gone."""
    for source in analysis.uncertainties:
        places = placed_rows(source, analysis).get(row) if source.name == row.source else None
        if places is not None:
            return source, places
    raise RowGoneError(
        Problem(
            "A row that is no longer in the list",
            dotted(row.control),
            f"{quoted(row.source)} on {quoted(row.process)}",
            "a row of the list as it is now",
            "change the row as it stands in the list",
        )
    )


def _removed(analysis: Analysis, sources: tuple[Uncertainty, ...], row: Row) -> tuple[Uncertainty, ...]:
    source, places = _placed(row, analysis)
    effects = tuple(effect for at, effect in enumerate(source.effects) if at not in places)
    if effects:
        return _with(sources, replace(source, effects=effects))
    return tuple(one for one in sources if one.name != source.name)


def _added(analysis: Analysis, sources: tuple[Uncertainty, ...], row: Row) -> tuple[Uncertainty, ...]:
    """Return the sources with a row appended to its own, in place of a pair without effect."""
    effect = Effect(row.process, row.up, row.down, row.regions)
    own = next((one for one in sources if one.name == row.source), None)
    if own is None:
        return (*sources, Uncertainty(row.source, (effect,)))
    own = _reaching(own, row, analysis)
    kept = tuple(one for one in own.effects if one.process != row.process or one.up or one.down)
    return _with(sources, replace(own, effects=(*kept, effect)))


def _reaching(source: Uncertainty, row: Row, analysis: Analysis) -> Uncertainty:
    """Return a source that leaves out none of the row's regions; its other effects act where they did."""
    if source.regions is None or (row.regions is not None and set(row.regions) <= set(source.regions)):
        return source
    effects = (
        replace(one, regions=regions_acted_on(one, source, analysis.process(one.process)))
        if one.regions is None
        else one
        for one in source.effects
    )
    return replace(source, effects=tuple(effects), regions=None)


def _with(sources: tuple[Uncertainty, ...], changed: Uncertainty) -> tuple[Uncertainty, ...]:
    return tuple(changed if one.name == changed.name else one for one in sources)
