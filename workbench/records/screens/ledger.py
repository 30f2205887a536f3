"""The screen of `ledger`: what carries the evidence, the heaviest first, the rest summed."""

from __future__ import annotations

import math
from collections.abc import Sequence

from workbench.evidence.ledger.results import Account, Hold, Part, Shares, Sum
from workbench.hypotheses.analysis import Analysis
from workbench.records.ledger_words import odds_words, reading, weight
from workbench.records.numbers import as_written, count, factor, fixed, ln_with_error, odds, with_errors
from workbench.records.outcomes import LedgerOutcome
from workbench.records.screens.counted import NONE, adequacy_lines, axis_label, loud_lines, title_lines
from workbench.records.screens.layout import (
    aligned_at,
    bullet,
    columns,
    framed,
    heading,
    one_line,
    paragraph,
    screen,
)
from workbench.records.sentences import usual_cautions, verdict_on_all

MOST_BINS = 12
MOST_UNCERTAINTIES = 15
_LONGEST_BAR = 8


def ledger_screen(outcome: LedgerOutcome) -> str:
    """Return what `ledger` found as text.

    Args:
        outcome: what was found.
    """
    adequacies = outcome.adequacies
    title = title_lines(outcome.analysis, outcome.origin)
    loud = loud_lines(adequacies)
    lines = [*loud, "", *title] if verdict_on_all(adequacies) else [*title, *([""] if loud else []), *loud]
    for note in outcome.origin.notes:
        lines += paragraph(note)
    lines += adequacy_lines(adequacies)
    for account in outcome.ledger.accounts:
        lines += account_lines(outcome.analysis, account)
    lines += heading("Cautions")
    comparisons = [account.comparison for account in outcome.ledger.accounts]
    for caution in usual_cautions(outcome.analysis, comparisons):
        lines += bullet(caution.text)
    if outcome.cautions:
        lines += heading("Warnings")
        for caution in outcome.cautions:
            lines += bullet(caution.text)
    return screen(lines)


def account_lines(analysis: Analysis, account: Account) -> list[str]:
    """Return the account of one Bayes factor: what it hangs on first, then the tables."""
    comparison = account.comparison
    names = f"{one_line(comparison.hypothesis)} against {one_line(comparison.against)}"
    lines = heading(f"What carries the evidence: {names}")
    value = comparison.ln_bayes_factor
    if value is None or not comparison.established:
        reason = "ln B is not established, and can't be told apart; oddsbench weigh says why."
        return lines + framed("NOT ESTABLISHED: NO LEDGER IS GIVEN", [reason])
    error = comparison.ln_bayes_factor_error or 0.0
    rows = [
        ["ln B", ln_with_error(value, error)],
        ["Bayes factor B", factor(value, error)],
        ["posterior odds", odds(value + math.log(comparison.prior_odds), error)],
    ]
    lines += columns(rows, "ll")
    sentences = reading(analysis, account)
    if account.shares is not None and not account.shares.established:
        sentences = [*sentences, f"The shares are not established: {account.shares.reason}."]
    lines += [""] if sentences else []
    for sentence in sentences:
        lines += bullet(sentence)
    if account.bins:
        lines += ["", *bin_lines(analysis, account)]
    if account.regions and (len(account.regions) > 1 or not account.bins):
        lines += ["", *region_lines(account)]
    if account.shares is not None and account.shares.established:
        lines += ["", *paragraph(shares_words(account.shares))]
    if account.uncertainties:
        lines += ["", *uncertainty_lines(account)]
    return lines


def bin_lines(analysis: Analysis, account: Account) -> list[str]:
    """Return the heaviest bins with their bars, the others summed, and all of them."""
    order = sorted(account.bins, key=weight, reverse=True)
    shown = order if len(order) <= MOST_BINS + 1 else order[:MOST_BINS]
    units = {region.name: region.unit for region in analysis.regions}
    several = len(units) > 1
    axis = "range" if several else axis_label(analysis.region(order[0].region))
    sums = _sums(account, len(order), len(shown))
    rows = [["bin", axis, *_HEADER, ""]]
    texts = _cells(account, shown, sums)
    for part, cells in zip(shown, texts[: len(shown)], strict=True):
        place = f"{as_written(part.low)} to {as_written(part.high)}"
        if several:
            place = f"{one_line(part.region)}: {place} {units[part.region]}".rstrip()
        rows.append([str(part.place), place, *cells])
    rows += [["", label, *cells] for (label, _), cells in zip(sums, texts[len(shown) :], strict=True)]
    return columns(rows, "rlrrrl")


def region_lines(account: Account) -> list[str]:
    """Return every region, in order, with its bar."""
    rows = [["region", "observed", *_HEADER, ""]]
    for part, cells in zip(account.regions, _cells(account, account.regions, ()), strict=True):
        rows.append([one_line(part.region), count(part.observed), *cells])
    return columns(rows, "lrrrrl")


def uncertainty_lines(account: Account) -> list[str]:
    """Return the uncertainties on which ln B hangs most: with each frozen, and twice as large."""
    value = account.comparison.ln_bayes_factor or 0.0
    order = sorted(account.uncertainties, key=lambda hold: hold.reach(value), reverse=True)
    shown = order if len(order) <= MOST_UNCERTAINTIES + 1 else order[:MOST_UNCERTAINTIES]
    texts = _ln_texts(shown)
    rows = [["uncertainty", "ln B if frozen", "odds", "if twice as large", "odds"]]
    for hold, frozen, doubled in zip(shown, texts[::2], texts[1::2], strict=True):
        rows.append(
            [
                one_line(hold.name),
                frozen,
                NONE if hold.frozen is None else odds_words(account, hold.frozen),
                doubled,
                NONE if hold.doubled is None else odds_words(account, hold.doubled),
            ]
        )
    lines = columns(rows, "lrrrr")
    if any(hold.frozen is None or hold.doubled is None for hold in shown):
        lines += paragraph("–: not established, or a prior without a width.")
    rest = order[len(shown) :]
    if rest:
        most = max(hold.reach(value) for hold in rest)
        lines += paragraph(f"The {len(rest)} others change ln B by {fixed(most, 2)} or less.")
    return lines


def shares_words(shares: Shares) -> str:
    """Return what the shares are and rest on."""
    said = (
        "Shares add up to ln B: each is what a count says once others are known, averaged over "
        f"{shares.orders:,} orders of the bins. ± is from orders and draws."
    )
    if shares.effective is None:
        return said
    return f"{said} A typical order rests on {shares.effective:,.0f} effective draws or more."


def bars(values: Sequence[float | None]) -> list[str]:
    """Return a bar of signs for each number: + for the hypothesis, − against it, the longest 8 signs."""
    largest = max((abs(value) for value in values if value is not None), default=0.0) or 1.0
    found = []
    for value in values:
        signs = 0 if value is None else round(_LONGEST_BAR * abs(value) / largest)
        found.append(("+" if (value or 0.0) > 0.0 else "−") * signs)
    return found


_HEADER = ("share of ln B", "ln B loses", "odds without")


def _cells(account: Account, parts: Sequence[Part], sums: Sequence[tuple[str, Sum]]) -> list[list[str]]:
    """Return share, loss, odds without, and a bar for each part, then the share of each sum."""
    values: list[float | None] = [*(part.share for part in parts), *(one.value for _, one in sums)]
    errors: list[float | None] = [*(part.share_error for part in parts), *(one.error for _, one in sums)]
    empty = [""] * len(sums)
    losses = _with_errors([part.loss for part in parts], [part.loss_error for part in parts])
    without = [odds_words(account, part.without) for part in parts]
    lengths = bars([part.loss if part.share is None else part.share for part in parts])
    shares = _with_errors(values, errors)
    table = zip(shares, [*losses, *empty], [*without, *empty], [*lengths, *empty], strict=True)
    return [list(row) for row in table]


def _sums(account: Account, bins: int, shown: int) -> list[tuple[str, Sum]]:
    """Return what the bins that are not shown add up to, and all of them."""
    if account.shares is None or not account.shares.rest:
        return []
    whole = (f"all {bins} bins", account.shares.rest[0])
    return [(f"{bins - shown} others", account.shares.rest[shown]), whole] if shown < bins else [whole]


def _ln_texts(holds: Sequence[Hold]) -> list[str]:
    values = [value for hold in holds for value in (hold.frozen, hold.doubled)]
    errors = [error for hold in holds for error in (hold.frozen_error, hold.doubled_error)]
    return _with_errors(values, errors)


def _with_errors(values: Sequence[float | None], errors: Sequence[float | None]) -> list[str]:
    """Return numbers with their errors, all with the same decimals; a dash where there is none."""
    known = [(value, error or 0.0) for value, error in zip(values, errors, strict=True) if value is not None]
    texts = iter(with_errors([value for value, _ in known], [error for _, error in known]))
    return aligned_at(" ±", [NONE if value is None else next(texts) for value in values])
