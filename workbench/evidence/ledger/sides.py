"""One hypothesis' side of the ledger: its draws, its chain along all orders, its evidence without parts."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np
import numpy.typing as npt

from workbench.evidence.ledger.bridge import Bridge, Rungs, bridge, exact_bridge, rungs_of
from workbench.evidence.ledger.chain import Chain, chain, sampling_errors
from workbench.evidence.ledger.changes import Changed
from workbench.evidence.ledger.holding import Held, held_evidences
from workbench.evidence.ledger.leaving_out import leave_out
from workbench.evidence.ledger.places import Place
from workbench.evidence.results import Evidence
from workbench.evidence.sampling import SCRAMBLES
from workbench.evidence.weigh import observed_counts
from workbench.likelihood.model import Model

Array = npt.NDArray[np.float64]
Indices = npt.NDArray[np.intp]

_FIRST_DRAWS, _LEAST_DRAWS, _MOST_DRAWS = 64, 16, 1024  # of each law in each scramble
_MOST_CELLS = 2.5e7  # draws times bins that are held at once
_PROBES = 16
_WANTED_ERROR = 0.02
_WANTED_EFFECTIVE = 100.0


@dataclass(frozen=True, slots=True)
class Side:
    """What the ledger needs of one hypothesis.

    Attributes:
        model: the compiled hypothesis.
        evidence: its evidence.
        chain: its ln evidence taken apart; None where not asked for, or where nothing could be drawn.
        bins, regions: its evidence without each; empty where not asked for.
        held: its evidences with each uncertainty frozen and doubled; empty where not asked for.
    """

    model: Model
    evidence: Evidence
    chain: Chain | None = None
    bins: Sequence[Changed] = ()
    regions: Sequence[Changed] = ()
    held: Mapping[str, Held] = field(default_factory=dict)


def side_of(
    model: Model,
    evidence: Evidence,
    groups: tuple[Sequence[Place], Sequence[Place]],
    orders: Indices,
    seed: np.random.SeedSequence,
    *,
    with_uncertainties: bool,
) -> Side:
    """Return one hypothesis' side.

    Args:
        model: the compiled hypothesis.
        evidence: its evidence, established.
        groups: the bins and the regions to leave out.
        orders: (pass, bin) orders of the bins, the same for every hypothesis.
        seed: where its random numbers come from.
        with_uncertainties: True to freeze and double each uncertainty as well.

    Returns:
        The side.

    Raises:
        InputError: if a region has no observed counts.
    """
    counts = observed_counts(model)
    for_draws, for_held, *for_groups = seed.spawn(2 + len(groups))
    rungs = rungs_of(model, counts) if model.size else None
    near = rungs.grid.mode if rungs is not None else {}
    drawn = _bridged(model, counts, rungs, orders, for_draws) if any(groups) else None
    bins, regions = (
        leave_out(model, evidence, drawn, [one.flags for one in group], child, near)
        for group, child in zip(groups, for_groups, strict=True)
    )
    return Side(
        model,
        evidence,
        None if drawn is None else chain(drawn, orders),
        bins,
        regions,
        held_evidences(model, evidence, for_held, near) if with_uncertainties else {},
    )


def _bridged(
    model: Model, counts: Array, rungs: Rungs | None, orders: Indices, seed: np.random.SeedSequence
) -> Bridge | None:
    """Return draws, doubled until some of the orders can be followed closely; None where none can be made."""
    if model.size == 0:
        return exact_bridge(model, counts)
    if rungs is None:
        return None
    laws = len(rungs.proposals) + 1
    most = _MOST_CELLS / (1.125 * laws * SCRAMBLES * model.bins)
    draws = int(np.clip(2 ** int(np.log2(max(most, 1.0))), _LEAST_DRAWS, _FIRST_DRAWS))
    try:
        found = bridge(rungs, seed.spawn(1)[0], draws)
        while 2 * draws <= min(most, _MOST_DRAWS) and not _is_close(chain(found, orders[:_PROBES])):
            found = found.joined(bridge(rungs, seed.spawn(1)[0], draws))
            draws *= 2
    except np.linalg.LinAlgError:  # numbers too far apart for double precision
        return None
    return found


def _is_close(linked: Chain) -> bool:
    """Tell whether the draws are enough for the shares that they give."""
    errors = sampling_errors(linked.shaken)
    return bool(linked.typical_effective >= _WANTED_EFFECTIVE and errors.max(initial=0.0) <= _WANTED_ERROR)
