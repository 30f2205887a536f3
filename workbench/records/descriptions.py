"""What an analysis declares, in words: shapes, yields, uncertainties, and who uses which template column."""

from __future__ import annotations

import dataclasses
from collections.abc import Iterator

from workbench.errors import quoted
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.exposure import Exposure
from workbench.hypotheses.processes import Contribution, Process
from workbench.hypotheses.quantities import Curve, Quantity
from workbench.hypotheses.shapes import Shape, Template, Templates
from workbench.hypotheses.uncertainties import Effect, Uncertainty
from workbench.records.numbers import as_written


def exposure_words(exposure: Exposure) -> str:
    """Return an exposure in words: "24 fb^-1", and "3.2 × 10^18 protons" where the unit is a number."""
    sign = " × " if exposure.unit[:1].isdigit() else " "
    return f"{as_written(exposure.collected)}{sign}{exposure.unit}".strip()


def quantity_words(quantity: Quantity) -> str:
    """Return a yield or a shape's number in words: a number, a parameter's name, a curve, a product."""
    if isinstance(quantity, str):
        return quantity
    if isinstance(quantity, Curve):
        return f"a curve over {quantity.parameter}"
    if isinstance(quantity, tuple):
        return " × ".join(quantity_words(part) for part in quantity)
    return as_written(quantity)


def shape_words(shape: Shape) -> str:
    """Return a shape in words, its numbers and parameters included."""
    if isinstance(shape, Template):
        return f"template {quoted(shape.column)}"
    if isinstance(shape, Templates):
        return f"{len(shape.columns)} templates over {shape.parameter}"
    parts = []
    for item in dataclasses.fields(shape):
        value = getattr(shape, item.name)
        name = item.name.replace("_", " ")
        if item.name == "coefficients":
            parts.append(f"{name} = {', '.join(quantity_words(part) for part in value)}")
        else:
            parts.append(f"{name} = {quantity_words(value)}")
    return f"{shape.family} ({', '.join(parts)})" if parts else shape.family


def yield_words(process: Process, contribution: Contribution) -> str:
    """Return what a process' expected events in a region are, before its shape and uncertainties."""
    own = "the column's sum" if contribution.events is None else quantity_words(contribution.events)
    return " × ".join([own, *(quantity_words(part) for part in process.factors)])


def alternative_priors(process: Process) -> dict[str, float]:
    """Return each alternative of a process with its prior probability; nothing where there is no doubt."""
    total = sum(one.prior for one in process.alternatives)
    return {one.name: one.prior / total for one in process.alternatives}


def effect_words(effect: Effect) -> str:
    """Return what a source does to one process: "+10 %", "+3 % / −4 %", or the columns that it swaps in."""
    where = f" in {', '.join(effect.regions)}" if effect.regions is not None else ""
    if isinstance(effect.up, str) or isinstance(effect.down, str):
        names = [size if isinstance(size, str) else percent(size) for size in (effect.up, effect.down or 0.0)]
        return f"columns {quoted(names[0])} / {quoted(names[1])}{where}"
    if effect.down is None:
        return percent(effect.up) + where
    return f"{percent(effect.up)} / {percent(effect.down)}{where}"


def source_words(source: Uncertainty) -> list[tuple[str, str]]:
    """Return (process, what the source does to it) for each of its effects, its own regions said."""
    limited = f" in {', '.join(source.regions)}" if source.regions is not None else ""
    return [
        (effect.process, effect_words(effect) + ("" if effect.regions is not None else limited))
        for effect in source.effects
    ]


def distortion_words(analysis: Analysis, hypothesis: str) -> str:
    """Return a hypothesis' distortion in words; empty where it has none."""
    distortion = analysis.hypothesis(hypothesis).distortion
    if distortion is None:
        return ""
    where = " and ".join(analysis.distorted_regions(hypothesis))
    terms = f"{distortion.terms} smooth term" + ("s" if distortion.terms > 1 else "")
    return f"distorted by {terms} of {as_written(100.0 * distortion.size)} % in {where}"


def percent(size: float) -> str:
    """Return a relative change as "+10 %" or "−4 %"."""
    text = as_written(abs(size) * 100.0)
    return f"{'−' if size < 0.0 else '+'}{text} %"


def column_uses(analysis: Analysis, region: str) -> dict[str, list[str]]:
    """Return who uses each template column of a region's table, in words; nobody is an empty list."""
    uses: dict[str, list[str]] = {name: [] for name in analysis.region(region).table.columns}
    for process in analysis.processes:
        for description in process.descriptions:
            for column in (
                _shape_columns(description.contribution.shape) if description.region == region else ()
            ):
                users = uses.setdefault(column, [])
                users += [] if process.name in users else [process.name]
    for source in analysis.uncertainties:
        for effect in source.effects:
            limits = effect.regions if effect.regions is not None else source.regions
            takes_part = region in analysis.process(effect.process).region_names
            if takes_part and (limits is None or region in limits):
                for column, side in _effect_columns(effect):
                    uses.setdefault(column, []).append(f"{source.name} ({side})")
    return uses


def _shape_columns(shape: Shape) -> tuple[str, ...]:
    if isinstance(shape, Template):
        return (shape.column,)
    return shape.columns if isinstance(shape, Templates) else ()


def _effect_columns(effect: Effect) -> Iterator[tuple[str, str]]:
    for column, side in ((effect.up, "up"), (effect.down, "down")):
        if isinstance(column, str):
            yield column, side
