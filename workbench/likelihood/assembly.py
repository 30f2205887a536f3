"""From an analysis and one of its hypotheses to parts that can be evaluated."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from workbench.counts.region import Region
from workbench.errors import InputError, Problem, quoted
from workbench.hypotheses.alternatives import in_doubt
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.jets import Jet, choose
from workbench.hypotheses.processes import Contribution, Process
from workbench.hypotheses.quantities import Quantity, evaluate, parameters_of
from workbench.hypotheses.shapes import Template, Templates
from workbench.hypotheses.splines import Spline
from workbench.hypotheses.uncertainties import Effect, curvature
from workbench.likelihood.parts import Formula, Part, Sources, Stem

Array = npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class Variations:
    """What the sources do to one process in one region, before it is sorted by kind.

    Attributes:
        linear, bend: source name to (bin,) or (1,) coefficients of its ln factor.
        added: source name to (bin,) additive coefficients (linear, bend), nonzero in additive bins only.
    """

    linear: dict[str, Array]
    bend: dict[str, Array]
    added: dict[str, tuple[Array, Array]]


def assemble(
    analysis: Analysis, hypothesis: str, coordinates: Mapping[str, int], held: Mapping[str, float]
) -> tuple[tuple[Part, ...], Sources]:
    """Return the parts of a hypothesis: every process in every region where it is.

    Args:
        analysis: everything declared.
        hypothesis: the hypothesis whose processes are taken.
        coordinates: free parameter and source names to their coordinate index.
        held: parameters held at a number.

    Returns:
        One part for each process and region, and the sources that act on all bins of a part alike.

    Raises:
        InputError: if a process has alternatives of which none is chosen: each is a model of its own.
    """
    _refuse_alternatives(analysis, hypothesis)
    made = []
    start = 0
    for region in analysis.regions:
        stop = start + region.table.binning.number
        for process in analysis.processes_of(hypothesis):
            if region.name in process.regions:
                bins = slice(start, stop)
                made.append(_part(analysis, process, region, bins, coordinates, held))
        start = stop
    return tuple(part for part, _ in made), _overall([found for _, found in made], coordinates)


def _refuse_alternatives(analysis: Analysis, hypothesis: str) -> None:
    problems = [
        Problem(
            "A background with alternatives where one description is needed",
            f"hypothesis {quoted(hypothesis)}, process {quoted(process.name)}",
            f"{len(process.alternatives)} alternatives",
            "one description in each region",
            "use weigh, fit, check or backgrounds, which take all of them, or keep one alternative",
        )
        for process in in_doubt(analysis, hypothesis)
    ]
    if problems:
        raise InputError(*problems)


def _part(
    analysis: Analysis,
    process: Process,
    region: Region,
    bins: slice,
    coordinates: Mapping[str, int],
    held: Mapping[str, float],
) -> tuple[Part, Variations]:
    contribution = process.regions[region.name]
    found = _variations(analysis, process, region, contribution)
    quantity = _amplitude(process, contribution)
    used = list(parameters_of(quantity))
    core, error_core, of_shape = _cores(region, contribution, found)
    used += [name for name in (*of_shape, *found.added) if name not in used]
    free = [name for name in used if name in coordinates]

    def stem(of: Formula) -> Stem:
        constants = {name: Jet.constant(held[name]) for name in used if name in held}
        scales = any(name in coordinates for name in parameters_of(quantity))
        moves = any(name in coordinates for name in (*of_shape, *found.added))
        return Stem(
            local=tuple(coordinates[name] for name in free),
            names=tuple(free),
            held={name: held[name] for name in used if name in held},
            amplitude=lambda arguments: evaluate(quantity, arguments),
            core=of,
            fixed_core=None if moves else np.asarray(of(constants).value),
            fixed_amplitude=None if scales else float(evaluate(quantity, constants).value),
            shaping=tuple(coordinates[name] for name in free if name in of_shape or name in found.added),
        )

    return Part(
        process=process.name,
        bins=bins,
        stem=stem(core),
        error=None if error_core is None else stem(error_core),
        by_bin=_by_bin(found, coordinates),
    ), found


def _amplitude(process: Process, contribution: Contribution) -> Quantity:
    """Return factors times yield as one product."""
    events = contribution.events
    if events is None:
        return process.factors
    return (*process.factors, *(events if isinstance(events, tuple) else (events,)))


def _by_bin(found: Variations, coordinates: Mapping[str, int]) -> Sources | None:
    """Return the sources that act differently in different bins; None without any."""
    names = [name for name, linear in found.linear.items() if linear.size > 1]
    if not names:
        return None
    indices = np.array([coordinates[name] for name in names], dtype=np.intp)
    bend = np.array([found.bend[name] for name in names])
    return Sources(indices, np.array([found.linear[name] for name in names]), bend, bool(bend.any()))


def _overall(found: list[Variations], coordinates: Mapping[str, int]) -> Sources:
    """Return the sources that act on all bins of a part alike, one row a part."""
    names = sorted(
        {name for one in found for name, linear in one.linear.items() if linear.size == 1},
        key=lambda name: coordinates[name],
    )
    linear, bend = np.zeros((len(names), len(found))), np.zeros((len(names), len(found)))
    for row, one in enumerate(found):
        for slot, name in enumerate(names):
            if name in one.linear and one.linear[name].size == 1:
                linear[slot, row], bend[slot, row] = one.linear[name][0], one.bend[name][0]
    indices = np.array([coordinates[name] for name in names], dtype=np.intp)
    return Sources(indices, linear, bend, bool(bend.any()))


def _variations(
    analysis: Analysis, process: Process, region: Region, contribution: Contribution
) -> Variations:
    found = Variations({}, {}, {})
    exposure = analysis.exposure
    if exposure is not None and exposure.uncertainty is not None and process.follows_exposure:
        _scale(found, "exposure", np.log1p([exposure.uncertainty]), -np.log1p([exposure.uncertainty]))
    for source in analysis.uncertainties:
        if source.regions is not None and region.name not in source.regions:
            continue
        for effect in source.effects:
            if effect.process != process.name:
                continue
            if effect.regions is None or region.name in effect.regions:
                _apply(found, source.name, effect, region, contribution)
    return found


def _apply(
    found: Variations, source: str, effect: Effect, region: Region, contribution: Contribution
) -> None:
    if isinstance(effect.up, str):
        nominal = template(region, _column(contribution))
        down = nominal if effect.down is None else template(region, str(effect.down))
        _vary(found, source, nominal, template(region, effect.up), down)
        return
    up = np.log1p([effect.up])
    _scale(found, source, up, -up if effect.down is None else np.log1p([float(effect.down)]))


def _column(contribution: Contribution) -> str:
    if not isinstance(contribution.shape, Template):
        raise TypeError("template variations act on templates; the analysis checks this at the door")
    return contribution.shape.column


def _scale(found: Variations, source: str, up: Array, down: Array) -> None:
    linear, bend = 0.5 * (up - down), 0.5 * (up + down)
    found.linear[source] = found.linear.get(source, np.zeros(1)) + linear
    found.bend[source] = found.bend.get(source, np.zeros(1)) + bend


def _vary(found: Variations, source: str, nominal: Array, up: Array, down: Array) -> None:
    ratio = (nominal > 0.0) & (up > 0.0) & (down > 0.0)
    with np.errstate(divide="ignore", invalid="ignore"):
        ln_up = np.where(ratio, np.log(up / nominal), 0.0)
        ln_down = np.where(ratio, np.log(down / nominal), 0.0)
    _scale(found, source, ln_up, ln_down)
    added = ~ratio & ((nominal > 0.0) | (up > 0.0) | (down > 0.0))
    if added.any():
        linear = np.where(added, 0.5 * (up - down), 0.0)
        bend = np.where(added, 0.5 * (up + down) - nominal, 0.0)
        found.added[source] = (linear, bend)


def template(region: Region, column: str) -> Array:
    """Return a template column's events per bin, negative bins set to zero where the region says so."""
    values = region.table.columns[column]
    return np.maximum(values, 0.0) if region.negative_templates == "zero" else values


def _cores(
    region: Region, contribution: Contribution, found: Variations
) -> tuple[Formula, Formula | None, tuple[str, ...]]:
    shape = contribution.shape
    if isinstance(shape, Template):
        nominal = template(region, shape.column)
        unit = float(nominal.sum()) if contribution.events is not None else 1.0
        error = region.table.errors.get(shape.column) if region.template_errors else None
        error_core = None if error is None else _constant(error / unit)
        if found.added:
            return _additive(nominal, unit, found.added), error_core, ()
        return _constant(nominal / unit), error_core, ()
    if isinstance(shape, Templates):
        return _interpolated(region, shape, by_sum=contribution.events is not None)
    quantities = shape.quantities
    names = tuple(name for quantity in quantities.values() for name in parameters_of(quantity))
    binning = region.table.binning

    def core(arguments: Mapping[str, Jet]) -> Jet:
        return shape.integrals(
            binning, {field: evaluate(quantity, arguments) for field, quantity in quantities.items()}
        )

    return core, None, names


def _constant(values: Array) -> Formula:
    def core(arguments: Mapping[str, Jet]) -> Jet:
        return Jet.constant(values, _variables(arguments))

    return core


def _variables(arguments: Mapping[str, Jet]) -> int:
    return max((jet.variables for jet in arguments.values()), default=0)


def _interpolated(
    region: Region, shape: Templates, by_sum: bool
) -> tuple[Formula, Formula | None, tuple[str, ...]]:
    columns = [template(region, column) for column in shape.columns]
    units = [float(column.sum()) if by_sum else 1.0 for column in columns]
    values = np.array([column / unit for column, unit in zip(columns, units, strict=True)])
    core = _along(shape.parameter, Spline(np.array(shape.at), values))
    table = region.table.errors
    if not region.template_errors or not all(column in table for column in shape.columns):
        return core, None, (shape.parameter,)
    errors = np.array([table[column] / unit for column, unit in zip(shape.columns, units, strict=True)])
    return core, _along(shape.parameter, Spline(np.array(shape.at), errors)), (shape.parameter,)


def _along(parameter: str, spline: Spline) -> Formula:
    def core(arguments: Mapping[str, Jet]) -> Jet:
        return spline.along(arguments[parameter])

    return core


def _additive(nominal: Array, unit: float, added: Mapping[str, tuple[Array, Array]]) -> Formula:
    """Return a template whose additive bins follow v = N + sum of l z + q g(z), made positive smoothly."""
    moved = np.any([linear != 0.0 for linear, _ in added.values()], axis=0)
    moved |= np.any([bend != 0.0 for _, bend in added.values()], axis=0)
    floor = 1e-6 * float(nominal.sum()) / nominal.size

    def core(arguments: Mapping[str, Jet]) -> Jet:
        total = Jet.constant(nominal, _variables(arguments))
        for source, (linear, bend) in added.items():
            z = arguments[source].over_bins()
            total = total + z * linear + z.apply(*curvature(z.value)) * bend
        root = _square_root(total * total + 4.0 * floor**2)
        positive = (total + root) * 0.5
        still = Jet.constant(nominal, _variables(arguments))
        return choose(moved, positive, still) * (1.0 / unit)

    return core


def _square_root(jet: Jet) -> Jet:
    root = np.sqrt(jet.value)
    return jet.apply(root, 0.5 / root, -0.25 / root**3)
