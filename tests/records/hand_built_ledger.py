"""A ledger built by hand, for what turns it into text, records and pictures; none of it was computed."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from tests.records import hand_built as hand
from workbench.ensembles.results import Adequacy
from workbench.errors import Caution
from workbench.evidence.ledger.results import (
    AFRESH,
    REWEIGHTED,
    Account,
    Hold,
    Ledger,
    Part,
    Shares,
    Sum,
)
from workbench.evidence.results import Weighing
from workbench.records.outcomes import LedgerOutcome

SHARES = np.array([-0.21, 0.08, -0.15, 0.32, 0.55, 3.41, 2.87, 0.62, -0.31, 0.24, -0.11, 0.405])
LOSSES = np.array([-0.34, 0.11, -0.22, 0.41, 0.83, 4.72, 4.01, 0.88, -0.36, 0.29, -0.17, 0.44])
VALUE = 7.715


def part(index: int, share: float | None, loss: float | None, way: str = REWEIGHTED) -> Part:
    """Return one bin of the hand-built analysis."""
    low, high = float(hand.EDGES[index]), float(hand.EDGES[index + 1])
    has_share, has_loss = share is not None, loss is not None
    return Part(
        "peak",
        index + 1,
        low,
        high,
        int(hand.OBSERVED[index]),
        share,
        0.03 if has_share else None,
        0.004 if has_share else None,
        VALUE - loss if loss is not None else None,
        0.008 if has_loss else None,
        loss,
        0.006 if has_loss else None,
        way,
        0.12 if way == REWEIGHTED else None,
    )


def whole() -> Part:
    """Return the one region there is, without which nothing is left."""
    first, last = float(hand.EDGES[0]), float(hand.EDGES[-1])
    observed = int(hand.OBSERVED.sum())
    share, loss = (7.725, 0.0, 0.006), (-0.01, 0.009, VALUE + 0.01, 0.009)
    return Part("peak", None, first, last, observed, *share, *loss, REWEIGHTED, -0.2)


def shares() -> Shares:
    """Return how the shares were made."""
    heaviest_first = np.sort(np.abs(SHARES))[::-1]
    light = [SHARES[np.abs(SHARES) < size].sum() for size in heaviest_first]
    rest = (Sum(7.725, 0.006), *(Sum(float(value), 0.04) for value in light))
    return Shares(128, 7.725, 0.006, 7936, 188.6, 21.3, 0.41, True, "", rest)


def holds() -> tuple[Hold, ...]:
    """Return uncertainties: one that matters, one without a width, one that is not established at all."""
    return (
        Hold("continuum normalisation", "source", 8.104, 0.006, 6.521, 0.007),
        Hold("muon efficiency", "source", 7.718, 0.006, None, None),
        Hold("continuum scale", "nuisance parameter", 7.702, 0.006, 7.733, 0.007),
        Hold("fake composition", "source", None, None, None, None),
    )


def account() -> Account:
    """Return the account of the resonance."""
    (comparison,) = hand.weighing().comparisons
    bins = tuple(
        part(index, float(share), float(loss), AFRESH if index == 5 else REWEIGHTED)
        for index, (share, loss) in enumerate(zip(SHARES, LOSSES, strict=True))
    )
    return Account(comparison, shares(), bins, (whole(),), holds())


def without_shares() -> Account:
    """Return an account whose shares are not established, with a bin left out that isn't either."""
    given = account()
    reason = "half of the orders rest on 4 effective draws or fewer, below 10"
    failed = replace(
        given.shares or shares(), total=None, total_error=None, established=False, reason=reason, rest=()
    )
    bins = tuple(part(index, None, None if index == 5 else float(loss)) for index, loss in enumerate(LOSSES))
    region = replace(whole(), share=None, order_error=None, sampling_error=None)
    return replace(given, shares=failed, bins=bins, regions=(region,))


def accounted(
    *accounts: Account, weighing: Weighing | None = None, judged: tuple[Adequacy, ...] | None = None
) -> LedgerOutcome:
    """Return what `ledger` would hand over."""
    caution = Caution(
        "one-bin-decides",
        '"resonance" against "background only": one single bin decides the verdict.',
    )
    found = Ledger(weighing or hand.weighing(), accounts or (account(),), 1, (caution,))
    origin = replace(hand.ORIGIN, options={"by": "all", "orders": 64, "pseudo_experiments": 2000})
    return LedgerOutcome(hand.analysis(), origin, found, judged or hand.adequacies(), hand.fits())


def missing() -> LedgerOutcome:
    """Return an outcome whose ln B is not established."""
    weighing = hand.unestablished()
    empty = Shares(0, None, None, 0, None, None, None, False, "ln B itself is not established")
    return accounted(Account(weighing.comparisons[0], empty, (), (), ()), weighing=weighing)
