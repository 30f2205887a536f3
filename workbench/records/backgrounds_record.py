"""The record of `backgrounds`."""

from __future__ import annotations

from typing import Any

from workbench.evidence.backgrounds import Backgrounds, Fake
from workbench.evidence.results import AlternativeEvidence
from workbench.evidence.spurious import FakedStrength
from workbench.records.files import FORMAT
from workbench.records.outcomes import BackgroundsOutcome
from workbench.records.provenance import inputs, versions
from workbench.records.weigh_record import caution_entries, origin_entries


def backgrounds_record(outcome: BackgroundsOutcome) -> dict[str, Any]:
    """Return the record of a comparison of backgrounds as JSON-ready values.

    Args:
        outcome: what was found.
    """
    found = outcome.found
    comparison = found.weighing.comparisons[0] if found.weighing is not None else None
    return {
        "format": FORMAT,
        "command": "backgrounds",
        "title": outcome.analysis.title,
        "inputs": inputs(outcome.analysis, outcome.origin),
        "versions": versions(),
        **origin_entries(outcome.origin),
        "hypothesis": found.hypothesis,
        "against": found.against,
        "ln_bayes_factor": None if comparison is None else comparison.ln_bayes_factor,
        "ln_bayes_factor_error": None if comparison is None else comparison.ln_bayes_factor_error,
        "established": found.is_established,
        "alternatives": [_alternative(found, place) for place in range(len(found.names))],
        "expected_counts": "fit to the observed counts" if found.is_fitted else "medians of the priors",
        "fakes": [_fake(found, fake) for fake in found.fakes],
        "warnings": caution_entries(outcome.cautions),
    }


def _alternative(found: Backgrounds, place: int) -> dict[str, Any]:
    name = found.names[place]
    entry: dict[str, Any] = {"name": name, "prior": found.priors[place]}
    weighing = found.weighing
    evidences = (None, None) if weighing is None else weighing.evidences
    for key, evidence in zip(("without_signal", "with_signal"), evidences, strict=True):
        listed = () if evidence is None else evidence.alternatives
        entry[key] = next((_evidence(one) for one in listed if one.name == name), None)
    factors = () if weighing is None else weighing.comparisons[0].alternatives
    factor = next((one for one in factors if one.name == name), None)
    entry["ln_bayes_factor"] = None if factor is None else factor.ln_bayes_factor
    entry["ln_bayes_factor_error"] = None if factor is None else factor.ln_bayes_factor_error
    entry["expected_without_signal"] = found.expected[place].tolist()
    return entry


def _evidence(one: AlternativeEvidence) -> dict[str, Any]:
    return {
        "ln_evidence": one.evidence.ln_evidence,
        "ln_evidence_error": one.evidence.error,
        "established": one.evidence.established,
        "reason": one.evidence.reason or None,
        "posterior": one.posterior,
        "posterior_error": one.posterior_error,
    }


def _fake(found: Backgrounds, fake: Fake) -> dict[str, Any]:
    faked = found.ln_faked(fake)
    return {
        "truth": fake.truth,
        "fitted": fake.fitted,
        "strengths": [_strength(one) for one in fake.strengths],
        "ln_bayes_factor": fake.ln_bayes_factor,
        "ln_bayes_factor_error": fake.ln_bayes_factor_error,
        "ln_bayes_factor_faked": None if faked is None else faked[0],
        "ln_bayes_factor_faked_error": None if faked is None else faked[1],
        "established": fake.established,
    }


def _strength(one: FakedStrength) -> dict[str, Any]:
    return {
        "parameter": one.parameter,
        "value": one.value,
        "error": one.error,
        "in_errors": one.in_errors,
        "events": one.events,
        "events_error": one.events_error,
        "at": dict(one.at),
    }
