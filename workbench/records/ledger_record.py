"""The record of `ledger`: its keys are kept, more may be added."""

from __future__ import annotations

from typing import Any

from workbench.evidence.ledger.results import Account, Hold, Part, Shares
from workbench.evidence.results import Evidence
from workbench.records.files import FORMAT
from workbench.records.ledger_words import reading
from workbench.records.outcomes import LedgerOutcome
from workbench.records.provenance import inputs, versions
from workbench.records.sentences import ln_posterior_odds, usual_cautions, verdict_on_all
from workbench.records.weigh_record import adequacy_entry, caution_entries, origin_entries


def ledger_record(outcome: LedgerOutcome) -> dict[str, Any]:
    """Return the record of a ledger as JSON-ready values.

    Args:
        outcome: what was found.
    """
    ledger, analysis = outcome.ledger, outcome.analysis
    comparisons = [account.comparison for account in ledger.accounts]
    adequacies = {item.hypothesis: adequacy_entry(item) for item in outcome.adequacies}
    return {
        "format": FORMAT,
        "command": "ledger",
        "title": analysis.title,
        "inputs": inputs(analysis, outcome.origin),
        "versions": versions(),
        **origin_entries(outcome.origin),
        "established": ledger.established,
        "adequacy_verdict": verdict_on_all(outcome.adequacies) or None,
        "hypotheses": [
            _hypothesis(item) | {"adequacy": adequacies.get(item.hypothesis)}
            for item in ledger.weighing.evidences
        ],
        "accounts": [
            _account(account) | {"reading": reading(analysis, account)} for account in ledger.accounts
        ],
        "cautions": caution_entries(usual_cautions(analysis, comparisons)),
        "warnings": caution_entries(outcome.cautions),
    }


def _hypothesis(evidence: Evidence) -> dict[str, Any]:
    return {
        "name": evidence.hypothesis,
        "ln_evidence": evidence.ln_evidence,
        "ln_evidence_error": evidence.error,
        "established": evidence.established,
        "reason": evidence.reason or None,
    }


def _account(account: Account) -> dict[str, Any]:
    comparison = account.comparison
    return {
        "hypothesis": comparison.hypothesis,
        "against": comparison.against,
        "ln_bayes_factor": comparison.ln_bayes_factor,
        "ln_bayes_factor_error": comparison.ln_bayes_factor_error,
        "prior_odds": comparison.prior_odds,
        "posterior_odds": comparison.posterior_odds,
        "ln_posterior_odds": ln_posterior_odds(comparison),
        "established": account.established,
        "shares": None if account.shares is None else _shares(account.shares),
        "bins": [_part(part) | {"bin": part.place, "way": part.way} for part in account.bins],
        "regions": [_part(part) | {"way": part.way} for part in account.regions],
        "uncertainties": [_hold(hold) for hold in account.uncertainties],
    }


def _shares(shares: Shares) -> dict[str, Any]:
    return {
        "established": shares.established,
        "reason": shares.reason or None,
        "total": shares.total,
        "total_error": shares.total_error,
        "drawn_total": None if shares.drawn is None else shares.drawn.value,
        "drawn_total_error": None if shares.drawn is None else shares.drawn.error,
        "orders": shares.orders,
        "draws": shares.draws,
        "effective_draws": shares.effective,
        "least_effective_draws": shares.least_effective,
        "k_hat": shares.k_hat,
    }


def _part(part: Part) -> dict[str, Any]:
    return {
        "region": part.region,
        "low": part.low,
        "high": part.high,
        "observed": part.observed,
        "share": part.share,
        "share_error": part.share_error,
        "order_error": part.order_error,
        "sampling_error": part.sampling_error,
        "loss": part.loss,
        "loss_error": part.loss_error,
        "ln_bayes_factor_without": part.without,
        "ln_bayes_factor_without_error": part.without_error,
        "k_hat": part.k_hat,
    }


def _hold(hold: Hold) -> dict[str, Any]:
    return {
        "name": hold.name,
        "kind": hold.kind,
        "ln_bayes_factor_frozen": hold.frozen,
        "ln_bayes_factor_frozen_error": hold.frozen_error,
        "ln_bayes_factor_doubled": hold.doubled,
        "ln_bayes_factor_doubled_error": hold.doubled_error,
    }
