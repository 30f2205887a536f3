"""One hypothesis' evidence without a bin or a region."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt

from workbench.evidence.ledger.bridge import Bridge
from workbench.evidence.ledger.changes import Changed, afresh, reweighted
from workbench.evidence.ledger.members import Member, average
from workbench.evidence.ledger.without import without
from workbench.evidence.results import Evidence
from workbench.evidence.weigh import weigh_hypothesis

Array = npt.NDArray[np.float64]
Flags = npt.NDArray[np.bool_]


def leave_out(
    members: Sequence[Member],
    evidence: Evidence,
    drawn: Bridge | None,
    groups: Sequence[Flags],
    seed: np.random.SeedSequence,
) -> list[Changed]:
    """Return what ln evidence is without each group of bins.

    With the draws' weights w = prior L/q of the whole likelihood:
        ln Z(without i) = ln Z + ln mean(w / p(n_i | x)) - ln mean(w)
    Where these weights' tail is too heavy, or their error too large, the evidence of the other bins is made
    afresh, and judged as every evidence is. What has a closed form keeps it.

    Args:
        members: the hypothesis' alternatives.
        evidence: its evidence.
        drawn: its weighted draws; None where there are none.
        groups: (bin,) flags of the bins that are left out together.
        seed: where the random numbers of fresh evidences come from.

    Returns:
        One answer a group.

    Source:
        Leave-one-out importance sampling: A.E. Gelfand, D.K. Dey, H. Chang (1992); from memory.
    """
    is_exact = evidence.error == 0.0
    found = []
    for group, child in zip(groups, seed.spawn(len(groups)), strict=True):
        answer = None if drawn is None or is_exact else _reweighted(evidence, drawn, group)
        found.append(answer or afresh(evidence, _without(members, evidence, group, child)))
    return found


def _without(
    members: Sequence[Member], evidence: Evidence, group: Flags, seed: np.random.SeedSequence
) -> Evidence:
    children = seed.spawn(len(members))
    others = [
        weigh_hypothesis(without(one.model, group), child, near=one.near).evidence
        for one, child in zip(members, children, strict=True)
    ]
    return average(evidence, members, others)


@np.errstate(all="ignore")  # a draw that can't fill a bin has ln probability -inf
def _reweighted(evidence: Evidence, drawn: Bridge, group: Flags) -> Changed | None:
    """Return the answer of the draws; None where they are too few to tell."""
    rest = drawn.ln_whole - drawn.ln_bins[group].sum(axis=0)
    lost = ~np.isfinite(drawn.ln_whole)
    if lost.any():
        rest[lost] = drawn.ln_base[lost] + drawn.ln_bins[np.ix_(~group, lost)].sum(axis=0)
    return reweighted(evidence, drawn.ln_whole, rest)
