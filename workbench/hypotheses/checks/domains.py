"""Priors under which a model makes no sense: counts or widths below 0, points beyond those interpolated.

A fault is laid at the door of the prior, or of the held number, that reaches too far.
"""

from __future__ import annotations

import math
from collections.abc import Iterator

from workbench.errors import quoted
from workbench.hypotheses.faults import Fault, KeyPath, dotted, field_path, shown
from workbench.hypotheses.priors import Normal
from workbench.hypotheses.processes import Description, Process
from workbench.hypotheses.quantities import Curve, Quantity
from workbench.hypotheses.reach import Reach, atoms, product_range
from workbench.hypotheses.shapes import Falling, Shape, Template, Templates

NEVER = 1e-6  # a part of a prior that is passed over


def contribution_domain_faults(
    path: KeyPath, description: Description, process: Process, reaches: dict[str, Reach]
) -> Iterator[Fault]:
    """Yield the faults of a yield, factors and shape numbers that can leave their domain.

    Args:
        path: the process' key path.
        description: what it contributes to the region looked at.
        process: the process.
        reaches: parameter name to reach.

    Yields:
        Each fault, at the prior or the number that reaches too far.
    """
    contribution, inside = description.contribution, (*path, *description.place)
    events = () if contribution.events is None else tuple(atoms(contribution.events))
    placed: list[tuple[KeyPath, float | str | Curve]] = [
        ((*path, "factors", place), one) for place, one in enumerate(process.factors)
    ]
    placed += [((*inside, "yield"), one) for one in events]
    low_high = product_range(tuple(one for _, one in placed), reaches)
    if low_high is not None and low_high[0] < 0:
        reason = f"it multiplies the yield of {quoted(process.name)} in {quoted(description.region)}"
        yield from _culprits(placed, 0.0, "An expected count can be negative", reason, reaches)
    yield from _shape_domain_faults(inside, contribution.shape, reaches)


def _shape_domain_faults(path: KeyPath, shape: Shape, reaches: dict[str, Reach]) -> Iterator[Fault]:
    if isinstance(shape, Template | Templates):
        return
    for key, quantity in shape.quantities.items():
        bound = shape.lower_bounds.get(key.partition("[")[0])
        if isinstance(shape, Falling) and _is_as_good_as_positive(quantity, reaches):
            continue
        if bound is not None:
            where = (*path, "shape", shape.family, *field_path(key))
            yield from _bound_faults(where, quantity, bound, f"The {key} of the {shape.family}", reaches)


def _is_as_good_as_positive(quantity: Quantity, reaches: dict[str, Reach]) -> bool:
    """Tell whether a scale is above 0 but for a part of its priors that no data will ever favour.

    A falling exponential of negative scale rises; its counts are never below 0, so that a normal prior far
    above 0 needs no cut.
    """
    names = [reaches.get(one) for one in atoms(quantity) if isinstance(one, str)]
    others = [one for one in atoms(quantity) if not isinstance(one, str)]
    lowest = [min(one.values, default=0.0) if isinstance(one, Curve) else one for one in others]
    return all(one > 0 for one in lowest) and all(
        reach is not None
        and float(reach.prior.quantile(NEVER)) > 0
        and all(number > 0 for number in reach.held.values())
        for reach in names
    )


def _bound_faults(
    path: KeyPath, quantity: Quantity, bound: tuple[float, bool], subject: str, reaches: dict[str, Reach]
) -> Iterator[Fault]:
    lowest, is_strict = bound
    ones = tuple(atoms(quantity))
    low_high = product_range(ones, reaches)
    if low_high is None:
        return
    condition = f"{'above' if is_strict else 'at least'} {shown(lowest)}"
    if low_high[0] < lowest:
        placed: list[tuple[KeyPath, float | str | Curve]] = [(path, one) for one in ones]
        reason = f"{subject.lower()} is {condition}"
        yield from _culprits(placed, lowest, f"{subject} can be below {shown(lowest)}", reason, reaches)
        return
    if is_strict and len(ones) == 1:
        yield from _at_bound(path, ones[0], lowest, subject, reaches)
    elif is_strict and low_high[1] <= lowest:
        yield Fault(path, f"{subject} is {shown(lowest)}", shown(quantity), condition, "change its factors")


def _at_bound(
    path: KeyPath, one: float | str | Curve, lowest: float, subject: str, reaches: dict[str, Reach]
) -> Iterator[Fault]:
    """Yield the fault of a single number, held or written, that lies exactly on a bound that is excluded."""
    expected = f"a number above {shown(lowest)}"
    if isinstance(one, Curve):
        if min(one.values) <= lowest:
            yield Fault(
                (*path, "values"),
                f"{subject} is {shown(lowest)}",
                shown(one.values),
                expected,
                "raise the smallest value",
            )
    elif not isinstance(one, str):
        if one <= lowest:
            yield Fault(path, f"{subject} is {shown(lowest)}", shown(one), expected, "write a larger number")
    else:
        reach = reaches[one]
        if reach.is_exact and reach.range[0] <= lowest:
            yield Fault(
                ("parameters", one, "prior"),
                f"{subject} is {shown(lowest)}",
                reach.prior.text(),
                expected,
                "hold it at a larger number",
            )
        for hypothesis, number in reach.held.items():
            if number <= lowest:
                yield Fault(
                    ("hypotheses", hypothesis, "fix", one),
                    f"{subject} is {shown(lowest)}",
                    shown(number),
                    expected,
                    "hold it at a larger number",
                )


def _culprits(
    placed: list[tuple[KeyPath, float | str | Curve]],
    lowest: float,
    what: str,
    reason: str,
    reaches: dict[str, Reach],
) -> Iterator[Fault]:
    """Yield a fault for every factor that is below the bound on its own, or for the product if none is."""
    expected = f"at least {shown(lowest)}: {reason}"
    has_culprit = False
    for path, one in placed:
        if isinstance(one, str):
            faults = list(_name_culprits(one, lowest, what, expected, reaches[one]))
        elif isinstance(one, Curve):
            is_low = min(one.values) < lowest
            faults = [Fault((*path, "values"), what, shown(one.values), expected, "raise the smallest value")]
            faults = faults if is_low else []
        else:
            faults = (
                [Fault(path, what, shown(one), expected, "write a larger number")] if one < lowest else []
            )
        has_culprit = has_culprit or bool(faults)
        yield from faults
    if not has_culprit:
        yield Fault(placed[0][0], what, "a product that reaches lower", expected, "change one of the factors")


def _name_culprits(name: str, lowest: float, what: str, expected: str, reach: Reach) -> Iterator[Fault]:
    low, high = reach.prior.support
    if low < lowest:
        reaching = "minus infinity" if math.isinf(low) else shown(low)
        remedy = f"let {dotted(('parameters', name))} start at {shown(lowest)} or above"
        if isinstance(reach.prior, Normal) and high > lowest:
            remedy = f"cut the prior off there: add low = {shown(lowest)}"
        yield Fault(
            ("parameters", name, "prior"),
            what,
            f"{reach.prior.text()}, which reaches down to {reaching}",
            expected,
            remedy,
        )
    for hypothesis, number in reach.held.items():
        if number < lowest:
            yield Fault(
                ("hypotheses", hypothesis, "fix", name),
                what,
                shown(number),
                expected,
                "hold it at a larger number",
            )


def interpolation_faults(
    path: KeyPath, name: str, at: tuple[float, ...], reaches: dict[str, Reach]
) -> Iterator[Fault]:
    """Yield the faults of a parameter that reaches outside the points where something is given.

    Args:
        path: where the points stand.
        name: the parameter.
        at: the points, ascending.
        reaches: parameter name to reach.

    Yields:
        Each fault, at the prior or the held number that reaches outside.
    """
    reach = reaches.get(name)
    if reach is None or len(at) < 2:
        return
    expected = f"inside {shown(min(at))} to {shown(max(at))}, the range of {dotted((*path, 'at'))}"
    what = "A parameter that reaches outside the points that are interpolated"
    low, high = reach.prior.support
    if low < min(at) or high > max(at):
        remedy = "narrow the prior, or give points further out"
        if isinstance(reach.prior, Normal):
            ends = f"low = {shown(min(at))}, high = {shown(max(at))}"
            remedy = f"cut the prior off: {ends}; or give points further out"
        yield Fault(("parameters", name, "prior"), what, reach.prior.text(), expected, remedy)
    for hypothesis, number in reach.held.items():
        if not min(at) <= number <= max(at):
            yield Fault(
                ("hypotheses", hypothesis, "fix", name),
                what,
                shown(number),
                expected,
                "hold it at a number inside, or give points further out",
            )
