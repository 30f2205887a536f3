"""What the ledger comes down to, in sentences: "Without bin 14 (44 to 46 GeV) the odds are ..."."""

from __future__ import annotations

import math

from workbench.errors import quoted
from workbench.evidence.ledger.reading import decides, firmest_hold, heaviest
from workbench.evidence.ledger.results import Account, Hold, Part
from workbench.hypotheses.analysis import Analysis
from workbench.records.numbers import as_written, odds


def part_words(analysis: Analysis, part: Part) -> str:
    """Return a bin or region in words: "bin 14 (44 to 46 GeV)", with its region where there are several."""
    if part.place is None:
        return f"region {quoted(part.region)}"
    where = f" of {quoted(part.region)}" if len(analysis.regions) > 1 else ""
    return f"bin {part.place}{where} ({range_words(analysis, part)})"


def weight(part: Part) -> float:
    """Return how much a part weighs, whatever its sign: by its share, or by its loss where there is none."""
    return abs((part.loss if part.share is None else part.share) or 0.0)


def range_words(analysis: Analysis, part: Part) -> str:
    """Return a bin's range with its unit: "44 to 46 GeV"."""
    unit = analysis.region(part.region).unit
    return f"{as_written(part.low)} to {as_written(part.high)}" + (f" {unit}" if unit else "")


def reading(analysis: Analysis, account: Account) -> list[str]:
    """Return the sentences that an account comes down to.

    Args:
        analysis: the analysis.
        account: the account of one Bayes factor.

    Returns:
        What the odds are without the bin, without the region, and with the uncertainty frozen or doubled,
        on which they hang most; none where they are not established.
    """
    if account.comparison.ln_bayes_factor is None or not account.comparison.established:
        return []
    sentences = []
    bins = heaviest(account.bins)
    if bins is not None and len(account.bins) > 1:
        sentences.append(_without(analysis, account, bins))
    region = heaviest(account.regions)
    if region is not None and len(account.regions) > 1:
        sentences.append(_without(analysis, account, region))
    hold = firmest_hold(account)
    if hold is not None:
        sentences.append(_held(account, hold))
    return sentences


def odds_words(account: Account, ln_bayes_factor: float | None) -> str:
    """Return the posterior odds that go with an ln B; "not established" without one."""
    if ln_bayes_factor is None:
        return "not established"
    return odds(ln_bayes_factor + math.log(account.comparison.prior_odds), 0.0)


def _without(analysis: Analysis, account: Account, part: Part) -> str:
    whole = odds_words(account, account.comparison.ln_bayes_factor)
    sentence = f"Without {part_words(analysis, part)} the odds are {odds_words(account, part.without)} "
    sentence += f"instead of {whole}."
    if part.place is not None and decides(account, part):
        sentence += " This single bin decides the verdict."
    return sentence


def _held(account: Account, hold: Hold) -> str:
    both = [("frozen", hold.frozen), ("twice as large", hold.doubled)]
    known = [f"{odds_words(account, value)} with it {how}" for how, value in both if value is not None]
    whole = odds_words(account, account.comparison.ln_bayes_factor)
    return (
        f"Of the uncertainties, {quoted(hold.name)} moves the odds most: {' and '.join(known)}, "
        f"{whole} as declared."
    )
