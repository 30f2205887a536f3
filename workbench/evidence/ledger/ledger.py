"""From an analysis to its ledger: what carries the evidence, by bin, by region and by uncertainty."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from workbench.errors import InputError, Problem, nearest, quoted
from workbench.evidence.ledger.accounts import account_of
from workbench.evidence.ledger.orders import random_orders
from workbench.evidence.ledger.places import bins_of, regions_of
from workbench.evidence.ledger.reading import deciding_cautions
from workbench.evidence.ledger.results import Ledger
from workbench.evidence.ledger.sides import side_of
from workbench.evidence.weigh import weigh
from workbench.hypotheses.analysis import Analysis

BY = ("bins", "regions", "uncertainties")
ORDERS = 64
LEAST_ORDERS = 2
_OWN_STREAM = 6  # keeps the ledger's random numbers apart from the weighing's


@np.errstate(all="ignore")  # an impossible point has ln probability -inf
def ledger(
    analysis: Analysis,
    *,
    hypothesis: str | None = None,
    by: Sequence[str] = BY,
    orders: int = ORDERS,
    seed: int = 1,
) -> Ledger:
    """Return what carries the evidence: the weight of each bin, region and uncertainty in each Bayes factor.

    Args:
        analysis: everything declared, with observed counts.
        hypothesis: the hypothesis whose Bayes factor against the first is accounted for; None for all.
        by: what to account for: "bins", "regions", "uncertainties".
        orders: number of random orders of the bins, at least 2; each is followed forward and reversed.
        seed: where every random number comes from.

    Returns:
        The weighing and one account for each comparison: for bins and regions their shares, which add up to
        ln B, and ln B without each; for uncertainties ln B with each frozen and doubled; all with errors.

    Raises:
        InputError: if a region has no observed counts, or a choice is not known.

    Limits:
        Shares need draws for any part of the counts. With twenty uncertainties or more that the counts
        measure far better than their priors do, they may not be established, and that is said; what ln B is
        without a bin stays.

    Source:
        Shares: chain rule averaged over orders, L.S. Shapley, A value for n-person games (1953). Without a
        bin: A.E. Gelfand, D.K. Dey, H. Chang (1992). Both from memory.
    """
    _refuse(analysis, hypothesis, by, orders)
    weighing = weigh(analysis, seed=seed)
    wanted = [one for one in weighing.comparisons if hypothesis in {None, one.hypothesis}]
    concerned = {weighing.evidences[0].hypothesis, *(one.hypothesis for one in wanted)}
    for_orders, *children = np.random.SeedSequence(seed, spawn_key=(_OWN_STREAM,)).spawn(
        1 + len(weighing.evidences)
    )
    bins, regions = bins_of(analysis), regions_of(analysis)
    passes = random_orders(len(bins), orders, for_orders)
    groups = (bins if "bins" in by else [], regions if "regions" in by else [])
    sides = {
        one.hypothesis: side_of(
            analysis, one, groups, passes, child, with_uncertainties="uncertainties" in by
        )
        for one, child in zip(weighing.evidences, children, strict=True)
        if one.hypothesis in concerned
    }
    accounts = tuple(
        account_of(one, sides[one.hypothesis], sides[one.against], bins, regions, by) for one in wanted
    )
    return Ledger(weighing, accounts, seed, deciding_cautions(accounts))


def _refuse(analysis: Analysis, hypothesis: str | None, by: Sequence[str], orders: int) -> None:
    """Refuse what can't be accounted for, all of it at once."""
    problems = [
        Problem(
            "Nothing known to account for", "by", quoted(str(one)), " or ".join(BY), nearest(str(one), BY)
        )
        for one in by
        if one not in BY
    ]
    if orders < LEAST_ORDERS:
        found = str(orders)
        problems.append(
            Problem("Too few orders", "orders", found, f"at least {LEAST_ORDERS}", f"leave it at {ORDERS}")
        )
    names = [one.name for one in analysis.hypotheses]
    if len(names) < 2:
        problems.append(
            Problem(
                "Nothing to compare",
                "hypotheses",
                "only " + quoted(names[0]),
                "at least two hypotheses",
                "declare a second one",
            )
        )
    elif hypothesis is not None and hypothesis not in names[1:]:
        what = (
            "The hypothesis that others are compared with" if hypothesis == names[0] else "No such hypothesis"
        )
        problems.append(
            Problem(
                what,
                "hypothesis",
                quoted(hypothesis),
                "one of: " + ", ".join(names[1:]),
                nearest(hypothesis, names[1:]),
            )
        )
    if problems:
        raise InputError(*problems)
