"""One hypothesis' side of the ledger: its chain along all orders, its evidence without parts."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np
import numpy.typing as npt

from workbench.evidence.ledger.chain import Chain, chain
from workbench.evidence.ledger.changes import Changed
from workbench.evidence.ledger.drawing import draws_of
from workbench.evidence.ledger.holding import Held, held_evidences
from workbench.evidence.ledger.leaving_out import leave_out
from workbench.evidence.ledger.members import members_of
from workbench.evidence.ledger.places import Place
from workbench.evidence.results import Evidence
from workbench.hypotheses.analysis import Analysis

Indices = npt.NDArray[np.intp]


@dataclass(frozen=True, slots=True)
class Side:
    """What the ledger needs of one hypothesis.

    Attributes:
        evidence: its evidence.
        chain: its ln evidence taken apart; None where not asked for, or where nothing could be drawn.
        bins, regions: its evidence without each; empty where not asked for.
        held: its evidences with each uncertainty frozen and doubled; empty where not asked for.
    """

    evidence: Evidence
    chain: Chain | None = None
    bins: Sequence[Changed] = ()
    regions: Sequence[Changed] = ()
    held: Mapping[str, Held] = field(default_factory=dict)


def side_of(
    analysis: Analysis,
    evidence: Evidence,
    groups: tuple[Sequence[Place], Sequence[Place]],
    orders: Indices,
    seed: np.random.SeedSequence,
    *,
    with_uncertainties: bool,
) -> Side:
    """Return one hypothesis' side.

    Args:
        analysis: everything declared.
        evidence: the hypothesis' evidence.
        groups: the bins and the regions to leave out.
        orders: (pass, bin) orders of the bins, the same for every hypothesis.
        seed: where its random numbers come from.
        with_uncertainties: True to freeze and double each uncertainty as well.

    Returns:
        The side; the evidence alone where that is not established.
    """
    if not evidence.established:
        return Side(evidence)
    for_draws, for_held, *for_groups = seed.spawn(2 + len(groups))
    members = members_of(analysis, evidence)
    drawn = draws_of(members, orders, for_draws) if any(groups) else None
    bins, regions = (
        leave_out(members, evidence, drawn, [one.flags for one in group], child)
        for group, child in zip(groups, for_groups, strict=True)
    )
    return Side(
        evidence,
        None if drawn is None else chain(drawn, orders),
        bins,
        regions,
        held_evidences(members, evidence, for_held) if with_uncertainties else {},
    )
