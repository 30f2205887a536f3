"""As many draws of a hypothesis as its shares need, over all of its alternatives."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt

from workbench.evidence.integral.sampling import SCRAMBLES
from workbench.evidence.ledger.bridge import Bridge, bridge, exact_bridge, mixed
from workbench.evidence.ledger.chain import Chain, chain, sampling_errors
from workbench.evidence.ledger.members import Member

Indices = npt.NDArray[np.intp]

_FIRST_DRAWS, _LEAST_DRAWS, _MOST_DRAWS = 64, 16, 1024  # of each law in each scramble
_MOST_CELLS = 2.5e7  # draws times bins that are held at once
_PROBES = 16
_WANTED_ERROR = 0.02
_WANTED_EFFECTIVE = 100.0


def draws_of(members: Sequence[Member], orders: Indices, seed: np.random.SeedSequence) -> Bridge | None:
    """Return the draws of a hypothesis, those of its alternatives together.

    Args:
        members: its alternatives.
        orders: (pass, bin) orders that will be followed.
        seed: where the random numbers come from.

    Returns:
        Weighted draws; None where those of an alternative can't be made.
    """
    found = []
    for member, child in zip(members, seed.spawn(len(members)), strict=True):
        own = _drawn(member, orders, child, _MOST_CELLS / len(members))
        if own is None:
            return None
        found.append(own)
    return mixed(found, [member.prior for member in members])


def _drawn(member: Member, orders: Indices, seed: np.random.SeedSequence, cells: float) -> Bridge | None:
    """Return draws, doubled until some of the orders can be followed closely."""
    model, rungs = member.model, member.rungs
    if model.size == 0:
        return exact_bridge(model, member.counts)
    if rungs is None:
        return None
    laws = len(rungs.proposals) + 1
    most = cells / (1.125 * laws * SCRAMBLES * model.bins)
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
