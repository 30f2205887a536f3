"""The record of `check`."""

from __future__ import annotations

from typing import Any

from workbench.ensembles.predictive import PriorPredictive
from workbench.hypotheses.distortion import Distortion
from workbench.records.descriptions import alternative_priors, source_words
from workbench.records.files import FORMAT
from workbench.records.outcomes import CheckOutcome
from workbench.records.provenance import inputs, versions
from workbench.records.sentences import verdict_on_all
from workbench.records.understanding import Understood, understood
from workbench.records.weigh_record import adequacy_entry, caution_entries, origin_entries


def check_record(outcome: CheckOutcome) -> dict[str, Any]:
    """Return the record of a check as JSON-ready values.

    Args:
        outcome: what was found.
    """
    analysis = outcome.analysis
    return {
        "format": FORMAT,
        "command": "check",
        "title": analysis.title,
        "inputs": inputs(analysis, outcome.origin),
        "versions": versions(),
        **origin_entries(outcome.origin),
        "regions": [_region(region) for region in understood(analysis)],
        "parameters": [
            {"name": item.name, "unit": item.unit, "prior": item.prior.text()} for item in analysis.parameters
        ],
        "processes": [
            {
                "name": item.name,
                "kind": item.kind,
                "regions": list(item.region_names),
                "alternatives": alternative_priors(item),
            }
            for item in analysis.processes
        ],
        "uncertainties": [
            {"name": source.name, "effects": dict(source_words(source))} for source in analysis.uncertainties
        ],
        "hypotheses": _hypotheses(outcome),
        "adequacy_verdict": verdict_on_all(outcome.adequacies) or None,
        "warnings": caution_entries(analysis.cautions),
    }


def _hypotheses(outcome: CheckOutcome) -> list[dict[str, Any]]:
    hypotheses = outcome.analysis.hypotheses
    total = sum(item.prior for item in hypotheses)
    adequacies = {item.hypothesis: adequacy_entry(item) for item in outcome.adequacies}
    predictives = {item.hypothesis: _predictive(item) for item in outcome.predictives}
    return [
        {
            "name": item.name,
            "prior": item.prior / total,
            "processes": list(item.processes),
            "fix": dict(item.fix),
            "distortion": _distortion(item.distortion),
            "prior_predictive": predictives.get(item.name),
            "adequacy": adequacies.get(item.name),
        }
        for item in hypotheses
    ]


def _distortion(distortion: Distortion | None) -> dict[str, Any] | None:
    if distortion is None:
        return None
    regions = None if distortion.regions is None else list(distortion.regions)
    return {"size": distortion.size, "terms": distortion.terms, "regions": regions}


def _region(region: Understood) -> dict[str, Any]:
    return {
        "name": region.name,
        "observable": region.observable,
        "unit": region.unit,
        "bins": region.bins,
        "first_edge": region.first_edge,
        "last_edge": region.last_edge,
        "observed": region.observed,
        "empty_bins": region.empty_bins,
        "single_count_bins": region.single_count_bins,
        "template_errors": region.template_errors,
        "columns": {
            column.name: {"sum": column.total, "used_by": list(column.used_by)} for column in region.templates
        },
    }


def _predictive(item: PriorPredictive) -> dict[str, Any]:
    return {
        "total": {"low": item.total_low, "median": item.total_median, "high": item.total_high},
        "low": item.low.tolist(),
        "median": item.median.tolist(),
        "high": item.high.tolist(),
    }
