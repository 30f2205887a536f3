"""The record of `breakpoint`."""

from __future__ import annotations

from typing import Any

from workbench.evidence.breaking.results import Distorted
from workbench.records.files import FORMAT
from workbench.records.outcomes import BreakPointOutcome
from workbench.records.provenance import inputs, versions
from workbench.records.weigh_record import caution_entries, origin_entries


def breakpoint_record(outcome: BreakPointOutcome) -> dict[str, Any]:
    """Return the record of a break point as JSON-ready values; sizes are relative, 0.03 is three per cent.

    Args:
        outcome: what was found.
    """
    found = outcome.found
    return {
        "format": FORMAT,
        "command": "breakpoint",
        "title": outcome.analysis.title,
        "inputs": inputs(outcome.analysis, outcome.origin),
        "versions": versions(),
        **origin_entries(outcome.origin),
        "hypothesis": found.hypothesis,
        "against": found.against,
        "ending": found.ending.name.lower(),
        "ending_text": found.ending.value,
        "reason": found.reason or None,
        "below": found.below,
        "within": found.within,
        "terms": found.terms,
        "ln_bayes_factor": found.ln_bayes_factor,
        "ln_bayes_factor_error": found.ln_bayes_factor_error,
        "under_peak": found.under_peak,
        "under_peak_error": found.under_peak_error,
        "rms": found.rms,
        "rms_error": found.rms_error,
        "reached_ln_bayes_factor": found.reached,
        "reached_ln_bayes_factor_error": found.reached_error,
        "stated_before": found.stated_before,
        "stated_after": found.stated_after,
        "distortion": [_distorted(one) for one in found.distorted],
        "evidences": found.evidences,
        "warnings": caution_entries(outcome.analysis.cautions),
    }


def _distorted(one: Distorted) -> dict[str, Any]:
    return {
        "region": one.region,
        "coefficients": list(one.coefficients),
        "change": one.change.tolist(),
        "background": one.background.tolist(),
        "signal": one.signal.tolist(),
    }
