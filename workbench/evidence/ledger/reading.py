"""What the ledger comes down to: the part, and the uncertainty, on which a Bayes factor hangs most."""

from __future__ import annotations

import math
from collections.abc import Sequence

from workbench.errors import Caution, quoted
from workbench.evidence.ledger.results import Account, Hold, Part

_MATTERS = 1.0  # nats: a smaller ln B decides nothing


def heaviest(parts: Sequence[Part]) -> Part | None:
    """Return the part without which ln B changes most; None where none is known."""
    known = [part for part in parts if part.loss is not None]
    return max(known, key=lambda part: abs(part.loss or 0.0), default=None)


def firmest_hold(account: Account) -> Hold | None:
    """Return the uncertainty that moves ln B most when frozen or doubled; None where none is known."""
    value = account.comparison.ln_bayes_factor or 0.0
    known = [hold for hold in account.uncertainties if hold.reach(value) > 0.0]
    return max(known, key=lambda hold: hold.reach(value), default=None)


def decides(account: Account, part: Part) -> bool:
    """Tell whether one part decides the verdict.

    It does where the odds without it favour another hypothesis than with it, or where more than half of ln B
    is lost, as long as there is a verdict at all: |ln B| above 1.

    Args:
        account: the account.
        part: one of its bins or regions.

    Returns:
        True where it does.

    Source:
        None; that a result should not hang on one bin is common practice, no source.
    """
    value, loss = account.comparison.ln_bayes_factor, part.loss
    if value is None or loss is None or abs(value) < _MATTERS:
        return False
    ln_prior_odds = math.log(account.comparison.prior_odds)
    before, after = value + ln_prior_odds, value - loss + ln_prior_odds
    return before * after < 0.0 or loss / value > 0.5


def deciding_cautions(accounts: Sequence[Account]) -> tuple[Caution, ...]:
    """Return a caution for each Bayes factor that one single bin decides.

    Args:
        accounts: one a comparison.

    Returns:
        Cautions that name the bin.

    Source:
        None, definition.
    """
    found = []
    for account in accounts:
        part = heaviest(account.bins)
        if part is not None and len(account.bins) > 1 and decides(account, part):
            found.append(
                Caution(
                    "one-bin-decides",
                    f"{quoted(account.comparison.hypothesis)} against {quoted(account.comparison.against)}: "
                    f"one single bin, {part.low:g} to {part.high:g} in region {quoted(part.region)}, decides "
                    "the verdict. See how it was filled, and what is expected in it, before anything rests "
                    "on these odds.",
                )
            )
    return tuple(found)
