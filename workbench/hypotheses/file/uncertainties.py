"""Uncertainties as the analysis file says them: one number, two-sided, template variations, by region."""

from __future__ import annotations

from workbench.hypotheses.faults import KeyPath, shown
from workbench.hypotheses.file.keys import Section
from workbench.hypotheses.uncertainties import Effect, Uncertainty

SIZE = "a number, { up, down } with two numbers or two column names, or { regions = { ... } }"


def read_uncertainty(name: str, section: Section) -> Uncertainty | None:
    """Return a source of uncertainty; None, with the faults noted, where it cannot be read."""
    regions = section.texts("regions") if section.has("regions") else None
    effects: list[Effect] = []
    holder = section.section("effects", "a table: process = size")
    for process, value in holder.content.items() if holder is not None else ():
        if holder is not None:
            effects += _effects(holder, process, value)
            section.is_sound = section.is_sound and holder.is_sound
    section.close()
    return Uncertainty(name, tuple(effects), regions) if section.is_sound else None


def _effects(holder: Section, process: str, value: object) -> list[Effect]:
    """Return what the source does to one process: one effect, or one for each region named."""
    if not isinstance(value, dict) or "regions" not in value:
        return _one(holder, process, value, (process,), None)
    section = holder.as_section(value, (process,), SIZE)
    effects: list[Effect] = []
    if section is not None:
        sizes = section.section("regions", "a table: region = size")
        for region, size in sizes.content.items() if sizes is not None else ():
            effects += _one(holder, process, size, (process, "regions", region), (region,))
        section.close()
        holder.is_sound = holder.is_sound and section.is_sound
    return effects


def _one(
    holder: Section, process: str, value: object, inside: KeyPath, regions: tuple[str, ...] | None
) -> list[Effect]:
    if not isinstance(value, dict):
        if isinstance(value, str):
            holder.is_sound = False
            holder.as_section(value, inside, SIZE)
            return []
        return [Effect(process, holder.as_number(value, inside), None, regions)]
    section = holder.as_section(value, inside, SIZE)
    if section is None:
        return []
    up, down = _side(section, "up"), _side(section, "down")
    section.close()
    if section.is_sound and isinstance(up, str) != isinstance(down, str):
        section.refuse(
            None,
            "A number on one side and a column on the other",
            shown(value),
            "two numbers or two column names",
            "write up and down in the same way",
        )
    holder.is_sound = holder.is_sound and section.is_sound
    return [Effect(process, up, down, regions)] if section.is_sound else []


def _side(section: Section, key: str) -> float | str:
    value = section.value(key, "a number or a column's name")
    if value is None or isinstance(value, str):
        return value or ""
    return section.as_number(value, (key,))
