"""What can be wrong with sources of uncertainty."""

from __future__ import annotations

import math
from collections.abc import Collection, Iterator

from workbench.counts.magnitudes import LARGEST_FACTOR
from workbench.errors import quoted
from workbench.hypotheses.declared import Declared
from workbench.hypotheses.effects import regions_acted_on
from workbench.hypotheses.faults import Fault, KeyPath, number_fault, shown
from workbench.hypotheses.processes import Process
from workbench.hypotheses.shapes import Template
from workbench.hypotheses.uncertainties import Effect, Uncertainty
from workbench.hypotheses.unknown_names import unknown_fault


def uncertainty_faults(declared: Declared) -> Iterator[Fault]:
    """Yield what is wrong with every source that could be read."""
    for name, source in declared.uncertainties.items():
        if source is not None:
            yield from _source(("uncertainties", name), source, declared)


def _source(path: KeyPath, source: Uncertainty, declared: Declared) -> Iterator[Fault]:
    if not source.effects:
        yield Fault(
            (*path, "effects"),
            "An uncertainty without effects",
            "none",
            "at least one process",
            "add effects.PROCESS = size",
        )
    for place, region in enumerate(source.regions or ()):
        if region not in declared.regions:
            yield unknown_fault((*path, "regions", place), "region", region, declared.regions)
    if source.regions is not None and not source.regions:
        yield Fault(
            (*path, "regions"),
            "An uncertainty limited to no region",
            "[]",
            "at least one region",
            "name a region, or leave regions out for all",
        )
    taken: set[tuple[str, str]] = set()
    for effect in source.effects:
        inner = (*path, "effects", effect.process)
        if effect.process not in declared.processes:
            yield unknown_fault(inner, "process", effect.process, declared.processes)
            continue
        process = declared.processes[effect.process]
        if process is not None:
            yield from _effect(inner, effect, source, process, declared)
            twice = [
                region
                for region in effect.regions or process.region_names
                if (effect.process, region) in taken
            ]
            if twice:
                yield Fault(
                    inner,
                    "Two effects of one source on one process and region",
                    f"{quoted(twice[0])} twice",
                    "one effect a process and region",
                    "multiply them into one, or make two sources",
                )
            taken |= {(effect.process, region) for region in effect.regions or process.region_names}


def _effect(
    path: KeyPath, effect: Effect, source: Uncertainty, process: Process, declared: Declared
) -> Iterator[Fault]:
    for region in effect.regions or ():
        if region not in process.region_names:
            yield unknown_fault(
                (*path, "regions", region),
                "region",
                region,
                process.region_names,
                f"a region of {quoted(process.name)}",
            )
        elif source.regions is not None and region not in source.regions:
            yield Fault(
                (*path, "regions", region),
                "An effect in a region that the source leaves out",
                quoted(region),
                "one of the source's own regions",
                "add the region to the source, or leave the effect out",
            )
    acted = regions_acted_on(effect, source, process)
    if (
        not acted
        and process.region_names
        and effect.regions is None
        and all(one in declared.regions for one in source.regions or ())
    ):
        yield Fault(
            path,
            "An effect that acts nowhere",
            f"{quoted(process.name)} is in none of the source's regions",
            "a process in one of them",
            "leave the effect out, or add a region",
        )
    yield from _sizes(path, effect, acted, process, declared)


def _sizes(
    path: KeyPath, effect: Effect, acted: Collection[str], process: Process, declared: Declared
) -> Iterator[Fault]:
    """Yield what is wrong with the numbers or columns of an effect."""
    single = (*path, "regions", effect.regions[0]) if effect.regions else path
    if isinstance(effect.up, str) and isinstance(effect.down, str):
        yield from _variation(single, (effect.up, effect.down), acted, process, declared)
    elif isinstance(effect.up, str) or isinstance(effect.down, str):
        yield Fault(
            single,
            "A number on one side and a column on the other",
            f"up = {shown(effect.up)}, down = {shown(effect.down)}",
            "two numbers or two column names",
            "write up and down in the same way",
        )
    else:
        sides = {"up": effect.up} if effect.down is None else {"up": effect.up, "down": effect.down}
        for side, size in sides.items():
            where = single if effect.down is None else (*single, side)
            if not (-1 < size < math.inf):
                yield Fault(
                    where,
                    "An effect that takes away everything or more",
                    shown(size),
                    "a relative change > -1: 0.10 is ten per cent",
                    "write a number above -1",
                )
                continue
            fault = number_fault(where, size)
            if fault is not None:
                yield fault
            elif size > LARGEST_FACTOR:
                yield overlarge_change(where, size)


def overlarge_change(path: KeyPath, size: float) -> Fault:
    """Return the fault of a relative change of more than a factor of a million."""
    return Fault(
        path,
        "An effect of more than a factor of a million",
        shown(size),
        f"a relative change of at most {LARGEST_FACTOR:,.0f}: 0.10 is ten per cent",
        "write the change relative to the nominal events",
    )


def _variation(
    path: KeyPath, columns: tuple[str, str], acted: Collection[str], process: Process, declared: Declared
) -> Iterator[Fault]:
    for name in acted:
        described = [one for one in process.descriptions if one.region == name]
        others = [one for one in described if not isinstance(one.contribution.shape, Template)]
        if others:
            alternative = others[0].alternative
            under = f" under {quoted(alternative)}" if alternative else ""
            shape = others[0].contribution.shape
            yield Fault(
                path,
                "A template variation of a shape that is no template",
                f"{quoted(process.name)} has the shape {shape.family} in {quoted(name)}{under}",
                "a process whose shape is a template",
                "give numbers, or limit the effect to other regions",
            )
            continue
        region = declared.regions.get(name)
        for side, column in zip(("up", "down"), columns, strict=True):
            if region is not None and column not in region.table.columns:
                yield unknown_fault(
                    (*path, side),
                    "template column",
                    column,
                    region.table.columns,
                    f"in {region.table.source}",
                )
