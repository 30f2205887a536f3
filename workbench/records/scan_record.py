"""The record of `scan`: the whole surface, so that a reader can apply a prior of their own."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping
from typing import Any

import numpy as np
import numpy.typing as npt

from workbench.evidence.ratio.results import Scan
from workbench.evidence.ratio.surface import Surface
from workbench.hypotheses.contents import prior_content
from workbench.hypotheses.priors import Prior
from workbench.records.files import FORMAT
from workbench.records.outcomes import ScanOutcome
from workbench.records.provenance import inputs, versions
from workbench.records.sentences import scan_cautions
from workbench.records.weigh_record import caution_entries

Array = npt.NDArray[np.float64]

_DIGITS = 10
_DECIMALS = 7


def scan_record(outcome: ScanOutcome) -> dict[str, Any]:
    """Return the record of a scan as JSON-ready values.

    Args:
        outcome: what was found.
    """
    found = outcome.found
    record: dict[str, Any] = {
        "format": FORMAT,
        "command": "scan",
        "title": outcome.analysis.title,
        "inputs": inputs(outcome.analysis, outcome.origin),
        "versions": versions(),
        "seed": found.seed,
        "options": dict(outcome.origin.options),
        "notes": list(outcome.origin.notes),
        "hypothesis": found.hypothesis,
        "against": found.against,
        "over": list(found.over),
        "established": found.established,
        "reason": found.reason or None,
        "prior_odds": found.prior_odds,
        "is_one_without_signal": found.is_nested,
        "priors": _priors(found.priors, found.units),
        "averaged": _priors(found.averaged, found.units),
        "ln_bayes_factor": found.ln_bayes_factor,
        "ln_bayes_factor_error": found.ln_bayes_factor_error,
        "draws": found.draws,
        "checks": [
            {
                "values": dict(check.values),
                "ln_ratio": check.ln_ratio,
                "error": check.error,
                "direct": check.direct,
                "direct_error": check.direct_error,
            }
            for check in found.checks
        ],
        **_readings(found),
        "surface": None if found.surface is None else _surface(found.surface),
        "cautions": caution_entries(scan_cautions(found)),
        "warnings": caution_entries(outcome.analysis.cautions),
    }
    return {**record, "digest": digest_of_scan(record)}


def digest_of_scan(record: Mapping[str, Any]) -> str:
    """Return the digest of everything in a record but the digest itself; how it is laid out has no share.

    Args:
        record: what `scan_record` makes, or what was read back.
    """
    surface = record["surface"] or {}
    lists = {key: value for key, value in surface.items() if isinstance(value, list) and key != "panels"}
    strengths = surface.get("strengths") or {}
    lists |= {f"strengths {key}": value for key, value in strengths.items() if isinstance(value, list)}
    rest = {key: value for key, value in record.items() if key not in {"digest", "surface"}}
    numbers = {key: value for key, value in strengths.items() if not isinstance(value, list)}
    found = hashlib.sha256()
    known = [rest, surface.get("panels"), numbers]
    found.update(json.dumps(known, sort_keys=True, allow_nan=False).encode("utf-8"))
    for name in sorted(lists):
        found.update(name.encode("utf-8"))
        found.update(np.asarray(lists[name], dtype="<f8").tobytes())
    return "sha256:" + found.hexdigest()


def _priors(priors: Mapping[str, Prior], units: Mapping[str, str]) -> dict[str, Any]:
    return {
        name: {"prior": prior_content(prior), "text": prior.text(), "unit": units.get(name, "")}
        for name, prior in priors.items()
    }


def _readings(found: Scan) -> dict[str, Any]:
    if found.surface is None:
        return {"peak": None, "average": None}
    values, ln_ratio, error = found.peak
    average = found.reprior()
    return {
        "peak": {"values": values, "ln_ratio": ln_ratio, "error": error},
        "average": {"ln_bayes_factor": average.ln_bayes_factor, "error": average.error},
    }


def _surface(surface: Surface) -> dict[str, Any]:
    strengths = surface.strengths
    return {
        "panels": [
            {"name": one.name, "unit": one.unit, "edges": one.edges.tolist()} for one in surface.panels
        ],
        "strengths": None
        if strengths is None
        else {
            "name": strengths.name,
            "low": strengths.low,
            "high": strengths.high,
            "offset": strengths.offset.tolist(),
            "centre": strengths.centre.tolist(),
            "scale": strengths.scale.tolist(),
            "nodes": _shortened(strengths.nodes),
        },
        "ln_ratio": np.round(surface.ln_ratio, _DECIMALS).tolist(),
        "error": np.round(surface.error, _DECIMALS).tolist(),
    }


def _shortened(values: Array) -> list[list[float]]:
    """Return rows of numbers with ten digits each: nodes need no more, and a record is read sooner."""
    return [[float(f"{value:.{_DIGITS}g}") for value in row] for row in values]
