"""Processes as the analysis file says them: factors, yields, shapes."""

from __future__ import annotations

from dataclasses import fields
from typing import Any, Literal

from workbench.errors import nearest, quoted
from workbench.hypotheses.faults import shown
from workbench.hypotheses.file.keys import Section
from workbench.hypotheses.processes import Alternative, Contribution, Process
from workbench.hypotheses.quantities import Curve, Quantity
from workbench.hypotheses.shapes import SHAPES, Bernstein, Shape, Template, Templates

QUANTITY = "a number, a parameter's name, a list of these, or { parameter, at, values }"
SHAPE = "{ FAMILY = { ... } }"


def read_process(name: str, section: Section) -> Process | None:
    """Return a process; None, with the faults noted, where it cannot be read."""
    kind = section.text("kind")
    factors = _factors(section)
    follows = section.truth("follows_exposure", True)
    alternatives = _alternatives(section)
    contributions = _contributions(section, is_needed=not section.has("alternatives"))
    section.close()
    if section.is_sound and kind not in {"background", "signal"}:
        section.refuse(
            "kind",
            "A kind of process that is not known",
            shown(kind),
            '"background" or "signal"',
            nearest(kind, ["background", "signal"]),
        )
    if not section.is_sound:
        return None
    checked: Literal["background", "signal"] = "signal" if kind == "signal" else "background"
    return Process(name, checked, contributions, factors, follows, alternatives)


def _contributions(section: Section, *, is_needed: bool = True) -> dict[str, Contribution]:
    """Return what is put into each region under the key `regions`."""
    contributions: dict[str, Contribution] = {}
    if is_needed and not section.has("regions"):
        section.value("regions", "a table with one table a region")
    for region, inner in section.sections("regions", "a table with a shape"):
        contribution = read_contribution(inner) if inner is not None else None
        if contribution is None:
            section.is_sound = False
        else:
            contributions[region] = contribution
    return contributions


def _alternatives(section: Section) -> tuple[Alternative, ...]:
    """Return the descriptions of which one holds, under the key `alternatives`."""
    found = []
    is_empty = section.has("alternatives") and section.content["alternatives"] == {}
    if is_empty:
        section.refuse(
            "alternatives",
            "A choice among nothing",
            "an empty table",
            "at least two alternatives",
            "describe the process under regions instead",
        )
    for name, inner in section.sections("alternatives", "a table with a prior and regions"):
        if inner is None:
            section.is_sound = False
            continue
        prior, contributions = inner.number("prior", 1.0), _contributions(inner)
        inner.close()
        section.is_sound = section.is_sound and inner.is_sound
        found.append(Alternative(name, contributions, prior))
    return tuple(found)


def read_contribution(section: Section) -> Contribution | None:
    """Return what a process puts into one region."""
    events = read_quantity(section, "yield") if section.has("yield") else None
    shape = read_shape(section)
    if section.is_sound and events is None and not isinstance(shape, Template | Templates):
        section.value("yield", "the expected events")
    section.close()
    return Contribution(shape, events) if section.is_sound and shape is not None else None


def read_shape(section: Section) -> Shape | None:
    """Return the shape under the key `shape`."""
    holder = section.section("shape", SHAPE)
    if holder is None:
        return None
    if len(holder.content) != 1:
        section.refuse(
            "shape",
            "A shape has exactly one family",
            shown(holder.content),
            SHAPE,
            "keep one family: " + ", ".join(SHAPES),
        )
        return None
    family = next(iter(holder.content))
    if family not in SHAPES:
        section.refuse(
            "shape",
            "A shape family that is not known",
            quoted(family),
            "a family of shapes",
            nearest(family, SHAPES),
        )
        return None
    inner = holder.section(family, "a table with the shape's numbers")
    shape = None if inner is None else _shape(family, inner)
    section.is_sound = section.is_sound and shape is not None
    return shape


def _shape(family: str, section: Section) -> Shape | None:
    shape: Shape | None
    made = SHAPES[family]
    if made is Template:
        column = section.text("column")
        shape = Template(column) if section.is_sound else None
    elif made is Templates:
        parameter, at, columns = section.text("parameter"), section.numbers("at"), section.texts("columns")
        shape = Templates(parameter, at, columns) if section.is_sound else None
    elif made is Bernstein:
        coefficients = _coefficients(section)
        shape = Bernstein(coefficients) if section.is_sound else None
    else:
        numbers: dict[str, Any] = {field.name: read_quantity(section, field.name) for field in fields(made)}
        shape = made(**numbers) if section.is_sound else None
    section.close()
    return shape


def _coefficients(section: Section) -> tuple[Quantity, ...]:
    value = section.value("coefficients", "a list of numbers or parameter names")
    if value is None:
        return ()
    if not isinstance(value, list) or not value:
        section.refuse(
            "coefficients",
            "The coefficients are not a list",
            shown(value),
            "a list of at least one number or parameter name",
            "write them in square brackets",
        )
        return ()
    read = [as_quantity(section, one, ("coefficients", place)) for place, one in enumerate(value)]
    return tuple(one for one in read if one is not None)


def read_quantity(section: Section, key: str) -> Quantity | None:
    """Return what stands for a number under a key; None, with a fault, where nothing does."""
    value = section.value(key, QUANTITY)
    return None if value is None else as_quantity(section, value, (key,))


def as_quantity(section: Section, value: object, inside: tuple[str | int, ...]) -> Quantity | None:
    """Return a value of the file as a number, a name, a curve or a product."""
    if not isinstance(value, list):
        return _single(section, value, inside)
    if not value:
        section.refuse(
            str(inside[0]), "An empty list where a number belongs", "[]", QUANTITY, "write a number"
        )
        return None
    read = [_single(section, one, (*inside, place)) for place, one in enumerate(value)]
    return tuple(one for one in read if one is not None)


def _single(section: Section, value: object, inside: tuple[str | int, ...]) -> float | str | Curve | None:
    if isinstance(value, str):
        return value
    if isinstance(value, dict):
        inner = section.as_section(value, inside, QUANTITY)
        curve = None if inner is None else _curve(inner)
        section.is_sound = section.is_sound and curve is not None
        return curve
    if isinstance(value, list):
        section.refuse(str(inside[0]), "A list inside a list", shown(value), QUANTITY, "write one list")
        return None
    return section.as_number(value, inside)


def _curve(section: Section) -> Curve | None:
    curve = Curve(section.text("parameter"), section.numbers("at"), section.numbers("values"))
    section.close()
    return curve if section.is_sound else None


def _factors(section: Section) -> tuple[float | str, ...]:
    if not section.has("factors"):
        return ()
    value = section.content["factors"]
    if not isinstance(value, list):
        section.refuse(
            "factors",
            "factors is not a list",
            shown(value),
            "a list of numbers or parameter names",
            "put it in square brackets",
        )
        return ()
    return tuple(
        one if isinstance(one, str) else section.as_number(one, ("factors", place))
        for place, one in enumerate(value)
    )
