"""What can be wrong with processes: names, shapes, interpolations."""

from __future__ import annotations

import itertools
import math
from collections.abc import Iterator

from workbench.counts.region import Region
from workbench.errors import nearest, quoted, shortened
from workbench.hypotheses.checks.alternatives import alternative_faults, choice_faults
from workbench.hypotheses.checks.domains import contribution_domain_faults, interpolation_faults
from workbench.hypotheses.declared import Declared
from workbench.hypotheses.faults import (
    Fault,
    KeyPath,
    dotted,
    field_path,
    number_fault,
    shown,
)
from workbench.hypotheses.processes import Contribution, Process
from workbench.hypotheses.quantities import Curve, Quantity
from workbench.hypotheses.reach import Reach, atoms, product_range, reaches_of
from workbench.hypotheses.shapes import Bernstein, PowerLaw, Shape, Template, Templates
from workbench.hypotheses.unknown_names import unknown_fault


def process_faults(declared: Declared) -> Iterator[Fault]:
    """Yield what is wrong with every process that could be read."""
    reaches = reaches_of(declared)
    for name, process in declared.processes.items():
        if process is not None:
            yield from _process(("processes", name), process, declared, reaches)
    yield from choice_faults(declared)


def _process(
    path: KeyPath, process: Process, declared: Declared, reaches: dict[str, Reach]
) -> Iterator[Fault]:
    if process.kind not in {"background", "signal"}:
        yield Fault(
            (*path, "kind"),
            "A kind of process that is not known",
            shown(process.kind),
            '"background" or "signal"',
            nearest(str(process.kind), ["background", "signal"]),
        )
    yield from alternative_faults(path, process)
    if not process.region_names:
        yield Fault(
            (*path, "regions"),
            "A process in no region",
            "none",
            "at least one region",
            f"add [{dotted((*path, 'regions'))}.NAME] for one of: {shortened(', '.join(declared.regions))}",
        )
    for place, factor in enumerate(process.factors):
        yield from _atom((*path, "factors", place), factor, declared, reaches)
    for description in process.descriptions:
        inner, region = (*path, *description.place), description.region
        if region not in declared.regions:
            yield unknown_fault(inner, "region", region, declared.regions)
        found = declared.regions.get(region)
        yield from _contribution(inner, description.contribution, declared, found, reaches)
        yield from contribution_domain_faults(path, description, process, reaches)


def _contribution(
    path: KeyPath,
    contribution: Contribution,
    declared: Declared,
    region: Region | None,
    reaches: dict[str, Reach],
) -> Iterator[Fault]:
    shape = contribution.shape
    if contribution.events is None and not isinstance(shape, Template | Templates):
        yield Fault(
            path, "The key yield is left out", "no such key", "yield = the expected events", "add yield"
        )
    for key, quantity in contribution.quantities.items():
        where = (*path, "yield") if key == "yield" else (*path, "shape", shape.family, *field_path(key))
        yield from _quantity(where, quantity, declared, reaches)
    if isinstance(shape, Templates):
        where = (*path, "shape", shape.family)
        if shape.parameter not in declared.parameters:
            yield unknown_fault((*where, "parameter"), "parameter", shape.parameter, declared.parameters)
        yield from at_faults(where, shape.at, len(shape.columns), "columns")
        yield from interpolation_faults(where, shape.parameter, shape.at, reaches)
    if region is not None:
        yield from _shape_in_region((*path, "shape", shape.family), shape, contribution, region, reaches)


def _shape_in_region(
    path: KeyPath, shape: Shape, contribution: Contribution, region: Region, reaches: dict[str, Reach]
) -> Iterator[Fault]:
    """Yield what is wrong with a shape and the bins and columns that it is given."""
    columns: dict[KeyPath, str] = {("column",): shape.column} if isinstance(shape, Template) else {}
    if isinstance(shape, Templates):
        columns = {("columns", place): column for place, column in enumerate(shape.columns)}
    for key, column in columns.items():
        values = region.table.columns.get(column)
        if values is None:
            yield unknown_fault(
                (*path, *key), "template column", column, region.table.columns, f"in {region.table.source}"
            )
        elif contribution.events is not None and not float(values.sum()) > 0:
            yield Fault(
                (*path, *key),
                "A template without events, but a yield to share out",
                f"{quoted(column)}, whose sum is 0",
                "a column with a sum above 0",
                "fill the column, or leave the yield out",
            )
    if isinstance(shape, PowerLaw) and not region.table.binning.first > 0:
        yield Fault(
            path,
            "A power law over bins that reach down to 0",
            f"first edge {shown(region.table.binning.first)}",
            "a first edge > 0: x**-index has no integral from 0",
            "cut the region above 0, or use another shape",
        )
    if isinstance(shape, Bernstein) and _are_all_zero(shape.coefficients, reaches):
        yield Fault(
            (*path, "coefficients"),
            "Bernstein coefficients that are all 0",
            shown(shape.coefficients),
            "at least one above 0",
            "write 1 for a flat shape",
        )


def _are_all_zero(quantities: tuple[Quantity, ...], reaches: dict[str, Reach]) -> bool:
    """Tell whether no value of any parameter lifts any of the quantities above 0."""
    ranges = [product_range(tuple(atoms(one)), reaches) for one in quantities]
    return all(one is not None and one[1] <= 0 for one in ranges)


def _quantity(
    path: KeyPath, quantity: Quantity, declared: Declared, reaches: dict[str, Reach]
) -> Iterator[Fault]:
    is_list = isinstance(quantity, tuple)
    if is_list and not quantity:
        yield Fault(
            path, "An empty list where a number belongs", "[]", "at least one number", "write a number"
        )
    for place, one in enumerate(atoms(quantity)):
        yield from _atom((*path, place) if is_list else path, one, declared, reaches)


def _atom(
    path: KeyPath, one: float | str | Curve, declared: Declared, reaches: dict[str, Reach]
) -> Iterator[Fault]:
    if isinstance(one, str):
        if one not in declared.parameters:
            yield unknown_fault(path, "parameter", one, declared.parameters)
    elif isinstance(one, Curve):
        if one.parameter not in declared.parameters:
            yield unknown_fault((*path, "parameter"), "parameter", one.parameter, declared.parameters)
        yield from at_faults(path, one.at, len(one.values), "values")
        yield from interpolation_faults(path, one.parameter, one.at, reaches)
        yield from _size_faults((*path, "values"), one.values)
    else:
        yield from _size_faults(path, (one,))


def _size_faults(path: KeyPath, numbers: tuple[float, ...]) -> Iterator[Fault]:
    """Yield the fault of the first number that is not finite, too large or too small."""
    yield from [fault for one in numbers if (fault := number_fault(path, one)) is not None][:1]


def at_faults(path: KeyPath, at: tuple[float, ...], number: int, what: str) -> Iterator[Fault]:
    """Yield what is wrong with the points of an interpolation."""
    if len(at) != number:
        yield Fault(
            (*path, what),
            f"at and {what} of different length",
            f"{len(at)} in at, {number} in {what}",
            "one for each",
            "complete the shorter list",
        )
    if len(at) < 2:
        yield Fault(
            (*path, "at"),
            "Fewer than two points to interpolate between",
            shown(at),
            "at least two",
            "add a point, or write the number alone",
        )
    yield from _size_faults((*path, "at"), at)
    if any(math.isnan(one) for one in at) or any(a >= b for a, b in itertools.pairwise(at)):
        yield Fault(
            (*path, "at"),
            "Points of an interpolation that do not ascend",
            shown(at),
            "numbers that ascend, each once",
            f"sort at, and {what} with it",
        )
