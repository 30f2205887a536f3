"""The record of `weigh`: its keys are kept, more may be added."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

from workbench.ensembles.results import Adequacy
from workbench.errors import Caution
from workbench.evidence.results import AlternativeEvidence, Comparison, Evidence, Posterior
from workbench.likelihood.results import Fit
from workbench.records.files import FORMAT
from workbench.records.outcomes import Origin, WeighOutcome
from workbench.records.provenance import inputs, versions
from workbench.records.sentences import ln_posterior_odds, usual_cautions, verdict_on_all


def weigh_record(outcome: WeighOutcome) -> dict[str, Any]:
    """Return the record of a weighing as JSON-ready values.

    Args:
        outcome: what was found.
    """
    weighing = outcome.weighing
    return {
        "format": FORMAT,
        "command": "weigh",
        "title": outcome.analysis.title,
        "inputs": inputs(outcome.analysis, outcome.origin),
        "versions": versions(*_packages(weighing.evidences)),
        "seed": weighing.seed,
        "options": dict(outcome.origin.options),
        "notes": list(outcome.origin.notes),
        "established": weighing.established,
        "adequacy_verdict": verdict_on_all(outcome.adequacies) or None,
        "hypotheses": [
            _hypothesis(evidence, posterior, adequacy, fit)
            for evidence, posterior, adequacy, fit in zip(
                weighing.evidences, weighing.posteriors, outcome.adequacies, outcome.fits, strict=True
            )
        ],
        "comparisons": [_comparison(comparison) for comparison in weighing.comparisons],
        "cautions": caution_entries(usual_cautions(outcome.analysis, weighing.comparisons)),
        "warnings": caution_entries(outcome.cautions),
    }


def _packages(evidences: Sequence[Evidence]) -> tuple[str, ...]:
    """Return the packages that evidences were made with beyond those that are always there."""
    every = [one for each in evidences for one in (each, *(part.evidence for part in each.alternatives))]
    return ("dynesty",) if any(one.engine == "nested" for one in every) else ()


def adequacy_entry(adequacy: Adequacy) -> dict[str, Any]:
    """Return an adequacy as JSON-ready values."""
    return {
        "p": adequacy.p,
        "p_error": adequacy.p_error,
        "fails": adequacy.fails,
        "statistic": adequacy.statistic,
        "pseudo_experiments": adequacy.pseudo_experiments,
        "unfinished_fits": adequacy.unfinished_fits,
        "alternative": adequacy.alternative or None,
    }


def caution_entries(cautions: tuple[Caution, ...]) -> list[dict[str, str]]:
    """Return cautions as JSON-ready values."""
    return [{"code": caution.code, "text": caution.text} for caution in cautions]


def origin_entries(origin: Origin) -> dict[str, Any]:
    """Return what a record says of the run itself."""
    return {"seed": origin.seed, "options": dict(origin.options), "notes": list(origin.notes)}


def _hypothesis(evidence: Evidence, posterior: Posterior, adequacy: Adequacy, fit: Fit) -> dict[str, Any]:
    return {
        "name": evidence.hypothesis,
        "prior": posterior.prior,
        "posterior": posterior.probability,
        "posterior_error": posterior.error,
        "ln_evidence": evidence.ln_evidence,
        "ln_evidence_error": evidence.error,
        "established": evidence.established,
        "reason": evidence.reason or None,
        "engine": evidence.engine,
        "engine_reason": evidence.engine_reason or None,
        "estimators": _estimators(evidence),
        "alternatives": [_alternative(one) for one in evidence.alternatives],
        "adequacy": adequacy_entry(adequacy),
        "fit": {
            "ending": fit.ending.value,
            "alternative": fit.alternative or None,
            "ln_likelihood": fit.ln_likelihood,
            "parameters": {item.name: {"value": item.value, "error": item.error} for item in fit.fitted},
            "expected": {name: float(events.sum()) for name, events in fit.by_process.items()},
        },
    }


def _estimators(evidence: Evidence) -> list[dict[str, Any]]:
    return [
        {
            "name": estimate.name,
            "ln_evidence": estimate.ln_evidence,
            "error": estimate.error,
            "k_hat": estimate.k_hat,
            "draws": estimate.draws,
        }
        for estimate in evidence.estimates
    ]


def _alternative(one: AlternativeEvidence) -> dict[str, Any]:
    return {
        "name": one.name,
        "prior": one.prior,
        "posterior": one.posterior,
        "posterior_error": one.posterior_error,
        "ln_evidence": one.evidence.ln_evidence,
        "ln_evidence_error": one.evidence.error,
        "established": one.evidence.established,
        "reason": one.evidence.reason or None,
        "engine": one.evidence.engine,
        "engine_reason": one.evidence.engine_reason or None,
        "estimators": _estimators(one.evidence),
    }


def _comparison(comparison: Comparison) -> dict[str, Any]:
    ln_factor, ln_odds = comparison.ln_bayes_factor, ln_posterior_odds(comparison)
    return {
        "hypothesis": comparison.hypothesis,
        "against": comparison.against,
        "ln_bayes_factor": ln_factor,
        "ln_bayes_factor_error": comparison.ln_bayes_factor_error,
        "log10_bayes_factor": None if ln_factor is None else ln_factor / math.log(10.0),
        "prior_odds": comparison.prior_odds,
        "posterior_odds": comparison.posterior_odds,
        "posterior_odds_error": comparison.posterior_odds_error,
        "ln_posterior_odds": ln_odds,
        "established": comparison.established,
        "sensitivity": [
            {
                "parameter": item.parameter,
                "prior": item.prior,
                "ln_bayes_factor_halved": item.halved,
                "ln_bayes_factor_doubled": item.doubled,
            }
            for item in comparison.sensitivity
        ],
        "alternatives": [
            {
                "name": one.name,
                "prior": one.prior,
                "ln_bayes_factor": one.ln_bayes_factor,
                "ln_bayes_factor_error": one.ln_bayes_factor_error,
                "established": one.established,
            }
            for one in comparison.alternatives
        ],
    }
