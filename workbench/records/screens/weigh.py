"""The screen of `weigh`: a short argument from what was counted to what follows."""

from __future__ import annotations

import math
from collections.abc import Sequence

from workbench.evidence.results import Comparison, Evidence, Posterior, ScaledPrior
from workbench.records.numbers import (
    count,
    decimals_for,
    factor,
    fixed,
    ln_with_error,
    odds,
    probability,
    with_errors,
)
from workbench.records.outcomes import WeighOutcome
from workbench.records.screens.alternatives import alternative_lines, with_alternatives
from workbench.records.screens.counted import (
    NONE,
    adequacy_lines,
    claimed_lines,
    counted_lines,
    loud_lines,
    title_lines,
)
from workbench.records.screens.engines import engine_lines
from workbench.records.screens.layout import (
    aligned_at,
    bullet,
    columns,
    framed,
    heading,
    named,
    one_line,
    paragraph,
    screen,
)
from workbench.records.sentences import ln_posterior_odds, usual_cautions, verdict_on_all

_NO_ESTIMATE = "no estimate"


def weigh_screen(outcome: WeighOutcome) -> str:
    """Return what `weigh` found as text; adequacy stands before the odds, and above all when nothing fits.

    Args:
        outcome: what was found.
    """
    weighing, adequacies = outcome.weighing, outcome.adequacies
    title = title_lines(outcome.analysis, outcome.origin)
    loud = loud_lines(adequacies)
    lines = [*loud, "", *title] if verdict_on_all(adequacies) else [*title, *([""] if loud else []), *loud]
    for note in outcome.origin.notes:
        lines += paragraph(note)
    lines += counted_lines(outcome.analysis)
    lines += claimed_lines(outcome.analysis, outcome.fits)
    lines += adequacy_lines(adequacies)
    lines += evidence_lines(weighing.evidences)
    for comparison in weighing.comparisons:
        lines += comparison_lines(comparison, weighing.evidences)
    lines += probability_lines(weighing.posteriors)
    lines += heading("Cautions")
    for caution in usual_cautions(outcome.analysis, weighing.comparisons):
        lines += bullet(caution.text)
    if outcome.cautions:
        lines += heading("Warnings")
        for caution in outcome.cautions:
            lines += bullet(caution.text)
    return screen(lines)


def evidence_lines(evidences: Sequence[Evidence]) -> list[str]:
    """Return each hypothesis' evidence by every estimator, side by side, and whether they agree."""
    labels: list[str] = []
    rest: list[list[str]] = []
    listed = with_alternatives(evidences)
    for label, evidence in listed:
        for place, estimate in enumerate(evidence.estimates):
            labels.append(label if place == 0 else "")
            k_hat = NONE if estimate.k_hat is None else fixed(estimate.k_hat, 2)
            rest.append([estimate.name, k_hat, count(estimate.draws) if estimate.draws else NONE])
        if not evidence.estimates:
            labels.append(label)
            rest.append([_NO_ESTIMATE, NONE, NONE])
    estimates = [estimate for _, evidence in listed for estimate in evidence.estimates]
    texts = iter(with_errors([one.ln_evidence for one in estimates], [one.error for one in estimates]))
    values = [NONE if other[0] == _NO_ESTIMATE else next(texts) for other in rest]
    cells = zip(labels, rest, aligned_at(" ±", values), strict=True)
    rows = [["hypothesis", "estimator", "ln evidence", "k-hat", "points"]]
    rows += [[label, other[0], value, other[1], other[2]] for label, other, value in cells]
    lines = [*heading("Evidences"), *columns(rows, "lllrr"), *engine_lines(evidences)]
    for names, reason in _doubts(evidences):
        verb = "is" if len(names) == 1 else "are"
        lines += bullet(f"{_joined(names)} {verb} not established: {reason}")
    if all(evidence.established for evidence in evidences):
        lines += paragraph("Every evidence is established: error, k-hat and agreement are all in order.")
    return lines


def comparison_lines(comparison: Comparison, evidences: Sequence[Evidence]) -> list[str]:
    """Return one hypothesis against the first: Bayes factor, odds, and what the strength's prior does."""
    names = f"{one_line(comparison.hypothesis)} against {one_line(comparison.against)}"
    lines = heading(f"Odds: {names}")
    ln_factor, ln_odds = comparison.ln_bayes_factor, ln_posterior_odds(comparison)
    if ln_factor is None or ln_odds is None:
        doubts = _not_established(comparison, evidences)
        return lines + doubts + alternative_lines(comparison, evidences)
    error = comparison.ln_bayes_factor_error or 0.0
    rows = [
        ["ln B", ln_with_error(ln_factor, error)],
        ["Bayes factor B", factor(ln_factor, error)],
        ["log10 B", ln_with_error(ln_factor / math.log(10.0), error / math.log(10.0))],
        ["prior odds", odds(math.log(comparison.prior_odds))],
        ["posterior odds", odds(ln_odds, error)],
    ]
    lines += columns(rows, "ll")
    for item in comparison.sensitivity:
        lines += ["", *_sensitivity_lines(item, comparison, ln_factor)]
    return lines + alternative_lines(comparison, evidences)


def probability_lines(posteriors: Sequence[Posterior]) -> list[str]:
    """Return every hypothesis' prior and posterior probability, of three and more also against the rest."""
    known = [posterior.probability for posterior in posteriors]
    has_rest = len(posteriors) > 2 and None not in known
    rows = [["hypothesis", "prior", "posterior", *["against the rest"] * has_rest]]
    for place, posterior in enumerate(posteriors):
        value = posterior.probability
        rest = sum(other for index, other in enumerate(known) if index != place and other is not None)
        after = "not established" if value is None else probability(value, rest, posterior.error)
        prior_rest = 1.0 - posterior.prior
        prior = probability(posterior.prior, prior_rest)
        rows.append([one_line(posterior.hypothesis), prior, after, *[_against(posterior, rest)] * has_rest])
    return [*heading("Probabilities"), *columns(rows, "lrll" if has_rest else "lrl")]


def _against(posterior: Posterior, rest: float) -> str:
    """Return a hypothesis' odds against all the others together."""
    value = posterior.probability
    if value is None or value <= 0.0 or rest <= 0.0:
        return NONE
    error = posterior.error or 0.0
    return odds(math.log(value) - math.log(rest), error / (value * rest))


def _doubts(evidences: Sequence[Evidence]) -> list[tuple[list[str], str]]:
    """Return (hypotheses, reason) of what is not established, a reason that several share once."""
    found: dict[str, list[str]] = {}
    for evidence in evidences:
        if not evidence.established:
            found.setdefault(evidence.reason.removesuffix(".") + ".", []).append(evidence.hypothesis)
    return [(names, reason) for reason, names in found.items()]


def _joined(names: Sequence[str]) -> str:
    return " and ".join(named(name) for name in names)


def _not_established(comparison: Comparison, evidences: Sequence[Evidence]) -> list[str]:
    pair = (comparison.hypothesis, comparison.against)
    concerned = [evidence for evidence in evidences if evidence.hypothesis in pair]
    reasons = [f"{_joined(names)}: {reason}" for names, reason in _doubts(concerned)]
    closing = "What each estimator says stands above; none of it is a result."
    frame = framed("NOT ESTABLISHED: NO ODDS ARE GIVEN", [*reasons, closing])
    return [*frame, *columns([["prior odds", odds(math.log(comparison.prior_odds))]], "ll")]


def _sensitivity_lines(item: ScaledPrior, comparison: Comparison, ln_factor: float) -> list[str]:
    name = one_line(item.parameter)
    if item.halved is None and item.doubled is None:
        return paragraph(
            f"The prior of {named(item.parameter)} ({item.prior}) has no width to halve or double."
        )
    decimals = max(decimals_for(comparison.ln_bayes_factor_error or 0.01), 1)
    rows = [[f"prior of {name}", "ln B", "posterior odds"]]
    for label, value in (
        ("half as wide", item.halved),
        (f"as declared, {item.prior}", ln_factor),
        ("twice as wide", item.doubled),
    ):
        after = NONE if value is None else odds(value + math.log(comparison.prior_odds), 0.0)
        rows.append([label, NONE if value is None else fixed(value, decimals), after])
    return columns(rows, "lrl")
