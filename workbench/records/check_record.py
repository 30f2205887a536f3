"""The record of `check`."""

from __future__ import annotations

from typing import Any

import numpy as np

from workbench.counts.region import Region
from workbench.ensembles.predictive import PriorPredictive
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.distortion import Distortion
from workbench.records.descriptions import alternative_priors, column_uses, source_words
from workbench.records.files import FORMAT
from workbench.records.outcomes import CheckOutcome
from workbench.records.provenance import inputs, versions
from workbench.records.sentences import verdict_on_all
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
        "regions": [_region(analysis, region) for region in analysis.regions],
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


def _region(analysis: Analysis, region: Region) -> dict[str, Any]:
    observed, binning = region.table.observed, region.table.binning
    uses = column_uses(analysis, region.name)
    return {
        "name": region.name,
        "observable": region.observable,
        "unit": region.unit,
        "bins": binning.number,
        "first_edge": binning.first,
        "last_edge": binning.last,
        "observed": None if observed is None else int(observed.sum()),
        "empty_bins": None if observed is None else int(np.sum(observed == 0)),
        "single_count_bins": None if observed is None else int(np.sum(observed == 1)),
        "template_errors": bool(region.template_errors),
        "columns": {
            name: {"sum": float(values.sum()), "used_by": uses.get(name, [])}
            for name, values in region.table.columns.items()
        },
    }


def _predictive(item: PriorPredictive) -> dict[str, Any]:
    return {
        "total": {"low": item.total_low, "median": item.total_median, "high": item.total_high},
        "low": item.low.tolist(),
        "median": item.median.tolist(),
        "high": item.high.tolist(),
    }
