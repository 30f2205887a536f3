"""The record of `fit`."""

from __future__ import annotations

from typing import Any

from workbench.likelihood.results import Fit, Fitted
from workbench.records.files import FORMAT
from workbench.records.outcomes import FitOutcome
from workbench.records.provenance import inputs, versions
from workbench.records.weigh_record import caution_entries, origin_entries


def fit_record(outcome: FitOutcome) -> dict[str, Any]:
    """Return the record of the fits as JSON-ready values, the whole correlation matrices included.

    Args:
        outcome: what was found.
    """
    return {
        "format": FORMAT,
        "command": "fit",
        "title": outcome.analysis.title,
        "inputs": inputs(outcome.analysis, outcome.origin),
        "versions": versions(),
        **origin_entries(outcome.origin),
        "hypotheses": [_fit(fit) for fit in outcome.fits],
        "warnings": caution_entries(outcome.analysis.cautions),
    }


def _fit(fit: Fit) -> dict[str, Any]:
    return {
        "name": fit.hypothesis,
        "ending": fit.ending.name.lower(),
        "ending_text": fit.ending.value,
        "ln_likelihood": fit.ln_likelihood,
        "ln_penalised_likelihood": fit.penalised,
        "parameters": [_fitted(item) for item in fit.fitted],
        "correlations": fit.correlations.tolist(),
        "expected": fit.expected.tolist(),
        "by_process": {name: events.tolist() for name, events in fit.by_process.items()},
        "notes": list(fit.notes),
        "alternative": fit.alternative or None,
        "others": [_fit(other) for other in fit.others],
    }


def _fitted(item: Fitted) -> dict[str, Any]:
    return {
        "name": item.name,
        "unit": item.unit,
        "role": item.role,
        "value": item.value,
        "error": item.error,
        "error_low": item.low,
        "error_high": item.high,
        "pull": item.pull,
        "contraction": item.contraction,
        "at_limit": item.at_limit,
    }
