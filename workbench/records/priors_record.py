"""The record of `priors`: its keys are kept, more may be added."""

from __future__ import annotations

import math
from typing import Any

from workbench.evidence.prior_choice.averages import Average
from workbench.evidence.prior_choice.bounds import Bound
from workbench.evidence.prior_choice.curve import LEAST_TOLD, StrengthCurve
from workbench.evidence.prior_choice.powers import PowerScaling
from workbench.evidence.prior_choice.results import PriorSensitivity
from workbench.evidence.prior_choice.sensitivity import SCALES
from workbench.records.files import FORMAT
from workbench.records.outcomes import PriorsOutcome
from workbench.records.provenance import inputs, versions
from workbench.records.sentences import usual_cautions, verdict_on_all
from workbench.records.weigh_record import adequacy_entry, caution_entries, origin_entries


def priors_record(outcome: PriorsOutcome) -> dict[str, Any]:
    """Return the record of an examination of priors as JSON-ready values.

    Args:
        outcome: what was found.
    """
    found = outcome.found
    return {
        "format": FORMAT,
        "command": "priors",
        "title": outcome.analysis.title,
        "inputs": inputs(outcome.analysis, outcome.origin),
        "versions": versions(),
        **origin_entries(outcome.origin),
        "established": found.established,
        "reason": found.reason or None,
        "adequacy_verdict": verdict_on_all(outcome.adequacies) or None,
        "adequacies": {one.hypothesis: adequacy_entry(one) for one in outcome.adequacies},
        **_question(found),
        "updating_ratio": None if found.curve is None else _curve(found.curve),
        "families": _families(found),
        "bounds": [_bound(one) for one in found.bounds],
        "local_p": _local(found),
        "boundaries": _boundaries(found),
        "wanted_posterior": found.posterior,
        "needed_priors": [
            {
                "by": one.by,
                "ln_bayes_factor": one.ln_bayes_factor,
                "probability": one.probability,
                "error": one.error,
            }
            for one in found.needed
        ],
        "power_scaling": [_scaling(one) for one in found.scalings],
        "cautions": caution_entries(usual_cautions(outcome.analysis, [found.comparison])),
        "warnings": caution_entries(outcome.cautions),
    }


def _question(found: PriorSensitivity) -> dict[str, Any]:
    comparison = found.comparison
    value, error = comparison.ln_bayes_factor, comparison.ln_bayes_factor_error
    return {
        "hypothesis": comparison.hypothesis,
        "against": comparison.against,
        "parameter": found.strength,
        "events_of_strength_1": found.events,
        "ln_bayes_factor": value if found.established else None,
        "ln_bayes_factor_error": error if found.established else None,
        "declared": {
            "prior": found.declared.text,
            "family": found.declared.family,
            "mean": found.declared.mean,
            "ln_bayes_factor_by_average": found.declared.by_curve.ln_bayes_factor,
            "error": found.declared.by_curve.error,
        },
    }


def _curve(curve: StrengthCurve) -> dict[str, Any]:
    return {
        "strengths": curve.strengths.tolist(),
        "ln_ratio": curve.ln_ratio.tolist(),
        "errors": [math.hypot(a, b) for a, b in zip(curve.errors, curve.between, strict=True)],
        "common_error": curve.against_error,
        "established": curve.established.tolist(),
    }


def _families(found: PriorSensitivity) -> list[dict[str, Any]]:
    return [
        {
            "name": family.name,
            "words": family.words,
            "members": [
                {"mean": float(mean), **_average(one)}
                for mean, one in zip(found.means, family.averages, strict=True)
            ],
        }
        for family in found.families
    ]


def _average(one: Average) -> dict[str, Any]:
    entry: dict[str, Any] = {"ln_bayes_factor": one.ln_bayes_factor, "error": one.error}
    return entry if one.ln_bayes_factor is not None else {**entry, "below": LEAST_TOLD}


def _bound(one: Bound) -> dict[str, Any]:
    return {
        "name": one.name,
        "ln_bayes_factor": one.ln_bayes_factor,
        "error": one.error,
        "reached_from": one.low,
        "reached_to": one.high,
    }


def _local(found: PriorSensitivity) -> dict[str, Any] | None:
    if found.local is None:
        return None
    local = found.local
    return {"p": local.p, "ln_p": local.ln_p, "statistic": local.statistic, "at": dict(local.at)}


def _boundaries(found: PriorSensitivity) -> list[dict[str, Any]]:
    return [
        {
            "scale": scale.name,
            "source": scale.source,
            "ln_bayes_factors": list(scale.boundaries),
            "crossings": [
                {
                    "family": one.family,
                    "ln_bayes_factor": one.boundary,
                    "mean": one.mean,
                    "error": one.error,
                    "rising": one.is_rising,
                }
                for one in found.crossings.get(scale.name, ())
            ],
        }
        for scale in SCALES
    ]


def _scaling(one: PowerScaling) -> dict[str, Any]:
    return {
        "parameter": one.parameter,
        "role": one.role,
        "prior": one.prior,
        "sensitivity_to_prior": one.by_prior,
        "sensitivity_to_prior_error": one.by_prior_error,
        "sensitivity_to_data": one.by_data,
        "sensitivity_to_data_error": one.by_data_error,
        "tension": one.tension,
        "rests_on": one.driver.value,
        "powers": [
            {
                "power": change.power,
                "ln_bayes_factor_change": change.ln_change,
                "error": change.error,
                "k_hat": change.k_hat,
                "made_again": change.is_fresh,
            }
            for change in one.changes
        ],
    }
