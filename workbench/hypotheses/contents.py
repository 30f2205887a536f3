"""The content of an analysis as plain tables, exactly as its file would say it, and the digest of that.

Both the writer and the digest start here, so that what is written is what is compared.
"""

from __future__ import annotations

import hashlib
import json
from dataclasses import fields
from typing import TYPE_CHECKING

from workbench.counts.region import Region
from workbench.counts.table import Table
from workbench.hypotheses.distortion import DEFAULT_TERMS, Distortion
from workbench.hypotheses.hypothesis import Hypothesis
from workbench.hypotheses.parameters import Parameter
from workbench.hypotheses.priors import Prior
from workbench.hypotheses.processes import Alternative, Contribution, Process
from workbench.hypotheses.quantities import Curve, Quantity
from workbench.hypotheses.shapes import Shape, Template, Templates
from workbench.hypotheses.uncertainties import Effect, Uncertainty

if TYPE_CHECKING:  # the analysis asks this module for its digest
    from workbench.hypotheses.analysis import Analysis

Content = dict[str, object]

# What a key means that is left out; a hypothesis' `prior` is a number, a parameter's is a table.
LEFT_OUT: Content = {
    "factors": [],
    "fix": {},
    "follows_exposure": True,
    "negative_templates": "refuse",
    "observable": "",
    "prior": 1.0,
    "terms": DEFAULT_TERMS,
    "unit": "",
}


def content_of(analysis: Analysis) -> Content:
    """Return the analysis as nested tables, with the regions' bins and columns left to the caller.

    Args:
        analysis: the analysis.

    Returns:
        Keys as in an analysis file; regions without `table`, `edges` and `observed`.

    Source:
        none, definition
    """
    content: Content = {"format": 1, "title": analysis.title}
    if analysis.exposure is not None:
        exposure = analysis.exposure
        content["exposure"] = _given(
            {
                "collected": float(exposure.collected),
                "unit": exposure.unit,
                "uncertainty": exposure.uncertainty,
            }
        )
    kinds: dict[str, Content] = {
        "regions": {region.name: region_content(region) for region in analysis.regions},
        "parameters": {one.name: _parameter(one) for one in analysis.parameters},
        "processes": {one.name: _process(one) for one in analysis.processes},
        "uncertainties": {one.name: _uncertainty(one) for one in analysis.uncertainties},
        "hypotheses": {one.name: _hypothesis(one) for one in analysis.hypotheses},
    }
    return content | {kind: named for kind, named in kinds.items() if named}


def digest_of_analysis(analysis: Analysis) -> str:
    """Return "sha256:..." of what an analysis says: declarations, in order, and every number of its tables.

    Args:
        analysis: the analysis.

    Returns:
        The digest; file names, comments and cautions don't enter.

    Source:
        none, definition
    """
    content = content_of(analysis)
    content["regions"] = {region.name: _choices(region) for region in analysis.regions}
    content["tables"] = {region.name: numbers_digest(region.table) for region in analysis.regions}
    text = json.dumps(content, ensure_ascii=True, separators=(",", ":"), default=float)
    return "sha256:" + hashlib.sha256(text.encode("ascii")).hexdigest()


def numbers_digest(table: Table) -> str:
    """Return the digest of a table's numbers and column names, whatever file they came from.

    Args:
        table: the table.

    Returns:
        Hexadecimal digits.

    Source:
        none, definition
    """
    parts = [("low", table.binning.low), ("high", table.binning.high)]
    parts += [] if table.observed is None else [("observed", table.observed)]
    parts += [(f"column {name}", table.columns[name]) for name in sorted(table.columns)]
    parts += [(f"error {name}", table.errors[name]) for name in sorted(table.errors)]
    digest = hashlib.sha256()
    for name, numbers in parts:
        digest.update(json.dumps([name, int(numbers.size)]).encode("ascii"))
        digest.update((numbers + 0.0).astype("<f8").tobytes())  # -0.0 + 0.0 is 0.0: the two are equal
    return digest.hexdigest()


def region_content(region: Region) -> Content:
    """Return a region's keys, its table left out."""
    return _given(
        {
            "observable": region.observable,
            "unit": region.unit,
            "template_errors": region.template_errors if region.table.errors else None,
            "negative_templates": None
            if region.negative_templates == "refuse"
            else region.negative_templates,
            "empty_bin_events": region.empty_bin_events,
        }
    )


def _choices(region: Region) -> Content:
    """Return a region's keys with the choice of template errors as it is in force, said or left out."""
    said = {key: value for key, value in region_content(region).items() if key != "template_errors"}
    return said | {"template_errors": bool(region.template_errors)}


def prior_content(prior: Prior) -> Content:
    """Return a prior as { FAMILY = { ... } }."""
    numbers: Content = {}
    for field in fields(prior):
        value = getattr(prior, field.name)
        if value is not None and value != field.default:
            numbers[field.name] = float(value)
    return {prior.family: numbers}


def shape_content(shape: Shape) -> Content:
    """Return a shape as { FAMILY = { ... } }."""
    if isinstance(shape, Template):
        return {shape.family: {"column": shape.column}}
    if isinstance(shape, Templates):
        at = [float(one) for one in shape.at]
        return {shape.family: {"parameter": shape.parameter, "at": at, "columns": list(shape.columns)}}
    numbers: Content = {}
    for field in fields(shape):
        value = getattr(shape, field.name)
        is_list = field.name == "coefficients"
        numbers[field.name] = [quantity_content(one) for one in value] if is_list else quantity_content(value)
    return {shape.family: numbers}


def quantity_content(quantity: Quantity) -> object:
    """Return a number, a name, a list or { parameter, at, values }."""
    if isinstance(quantity, tuple):
        return [quantity_content(one) for one in quantity]
    if isinstance(quantity, Curve):
        at, values = [float(one) for one in quantity.at], [float(one) for one in quantity.values]
        return {"parameter": quantity.parameter, "at": at, "values": values}
    return quantity if isinstance(quantity, str) else float(quantity)


def _given(content: Content) -> Content:
    return {key: value for key, value in content.items() if value is not None}


def _parameter(parameter: Parameter) -> Content:
    return _given({"prior": prior_content(parameter.prior), "unit": parameter.unit})


def _process(process: Process) -> Content:
    content: Content = {
        "kind": process.kind,
        "factors": [one if isinstance(one, str) else float(one) for one in process.factors],
        "follows_exposure": process.follows_exposure,
    }
    if process.regions or not process.alternatives:
        content["regions"] = {name: _contribution(one) for name, one in process.regions.items()}
    if process.alternatives:
        content["alternatives"] = {one.name: _alternative(one) for one in process.alternatives}
    return content


def _alternative(alternative: Alternative) -> Content:
    return {
        "prior": float(alternative.prior),
        "regions": {name: _contribution(one) for name, one in alternative.regions.items()},
    }


def _contribution(contribution: Contribution) -> Content:
    content: Content = {}
    if contribution.events is not None:
        content["yield"] = quantity_content(contribution.events)
    return content | {"shape": shape_content(contribution.shape)}


def _uncertainty(source: Uncertainty) -> Content:
    content: Content = {}
    if source.regions is not None:
        content["regions"] = list(source.regions)
    effects: dict[str, object] = {}
    by_region: dict[str, dict[str, object]] = {}
    for effect in source.effects:
        if effect.regions is None:
            effects[effect.process] = _size(effect)
        else:
            sizes = by_region.setdefault(effect.process, {})
            sizes.update(dict.fromkeys(effect.regions, _size(effect)))
            effects[effect.process] = {"regions": sizes}
    return content | {"effects": effects}


def _size(effect: Effect) -> object:
    if effect.down is None:
        return effect.up if isinstance(effect.up, str) else float(effect.up)
    sides = {"up": effect.up, "down": effect.down}
    return {side: size if isinstance(size, str) else float(size) for side, size in sides.items()}


def _hypothesis(hypothesis: Hypothesis) -> Content:
    content: Content = {
        "processes": list(hypothesis.processes),
        "prior": float(hypothesis.prior),
        "fix": {name: float(hypothesis.fix[name]) for name in sorted(hypothesis.fix)},
    }
    if hypothesis.distortion is not None:
        content["distortion"] = _distortion(hypothesis.distortion)
    return content


def _distortion(distortion: Distortion) -> Content:
    regions = None if distortion.regions is None else list(distortion.regions)
    return _given({"size": float(distortion.size), "terms": int(distortion.terms), "regions": regions})
