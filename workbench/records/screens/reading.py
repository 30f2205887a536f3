"""The screen of `weigh --reprior`: what the reader's own priors make of a saved updating ratio."""

from __future__ import annotations

import math

from workbench.records.numbers import factor, ln_with_error, odds
from workbench.records.outcomes import ReadingOutcome
from workbench.records.screens.layout import bullet, columns, framed, heading, one_line, paragraph, screen
from workbench.records.sentences import reading_cautions


def reading_screen(outcome: ReadingOutcome) -> str:
    """Return what other priors make of a saved scan as text.

    Args:
        outcome: what was found.
    """
    found, average = outcome.found, outcome.average
    lines = paragraph(outcome.title or "Untitled analysis", "")
    source = f" · scan of {outcome.file}" if outcome.file else ""
    lines += paragraph(f"{outcome.record}{source} · seed {found.seed} · nothing fitted again", "")
    lines += prior_lines(outcome)
    names = f"{one_line(average.hypothesis)} against {one_line(average.against)}"
    lines += heading(f"Odds: {names}")
    ln_odds, prior_odds = average.ln_posterior_odds, odds(math.log(average.prior_odds))
    if ln_odds is None:
        reason = found.reason.removesuffix(".") + "."
        lines += framed("NOT ESTABLISHED: NO ODDS ARE GIVEN", [reason])
        lines += columns([["prior odds", prior_odds]], "ll")
    else:
        ln_factor, error = average.ln_bayes_factor, average.error
        rows = [
            ["ln B", ln_with_error(ln_factor, error)],
            ["Bayes factor B", factor(ln_factor, error)],
            ["log10 B", ln_with_error(ln_factor / math.log(10.0), error / math.log(10.0))],
            ["prior odds", prior_odds],
            ["posterior odds", odds(ln_odds, error)],
        ]
        lines += columns(rows, "ll")
        if outcome.asked:
            stated = found.reprior()
            before = ln_with_error(stated.ln_bayes_factor, stated.error)
            lines += ["", *columns([["ln B under the priors stated in the record", before]], "ll")]
    lines += heading("Cautions")
    for caution in reading_cautions(found):
        lines += bullet(caution.text)
    return screen(lines)


def prior_lines(outcome: ReadingOutcome) -> list[str]:
    """Return the priors in force: the reader's, those stated in the record, and those averaged over."""
    found, average = outcome.found, outcome.average
    rows = [["signal parameter", "prior", ""]]
    for name, prior in average.priors.items():
        unit = found.units.get(name, "")
        label = f"{one_line(name)} [{one_line(unit)}]" if unit else one_line(name)
        rows.append([label, prior.text(), "yours" if name in outcome.asked else "as stated in the record"])
    for name, prior in average.averaged.items():
        rows.append([one_line(name), prior.text(), "averaged over in the record"])
    return [*heading("Priors"), *columns(rows, "lll")]
