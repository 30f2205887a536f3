"""The account of one Bayes factor, from both hypotheses' sides."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from workbench.evidence.ledger.changes import Changed, unchanged
from workbench.evidence.ledger.holding import Held
from workbench.evidence.ledger.places import Place
from workbench.evidence.ledger.results import AFRESH, EXACT, REWEIGHTED, Account, Hold, Part, Shares
from workbench.evidence.ledger.shares import Split, split
from workbench.evidence.ledger.sides import Side
from workbench.evidence.results import Comparison


def account_of(
    comparison: Comparison,
    side: Side,
    against: Side,
    bins: Sequence[Place],
    regions: Sequence[Place],
    by: Sequence[str],
) -> Account:
    """Return the account of one comparison.

    Args:
        comparison: the Bayes factor.
        side: the hypothesis' side.
        against: that of the first hypothesis.
        bins: the bins that the sides left out.
        regions: the regions that they left out.
        by: what was asked for.

    Returns:
        The account; its bins, regions and uncertainties are empty where ln B itself is not established.
    """
    if not comparison.established:
        reason = "ln B itself is not established"
        return Account(comparison, Shares(0, None, None, 0, None, None, None, False, reason), (), (), ())
    apart = split(comparison, side.chain, against.chain)
    how = None
    if "bins" in by or "regions" in by:
        missing = Shares(
            0, None, None, 0, None, None, None, False, "no draws can be made for parts of the counts"
        )
        how = missing if apart is None else apart.how
    return Account(
        comparison,
        how,
        _parts(comparison, apart, bins, side.bins, against.bins) if "bins" in by else (),
        _parts(comparison, apart, regions, side.regions, against.regions) if "regions" in by else (),
        _holds(side, against) if "uncertainties" in by else (),
    )


def _parts(
    comparison: Comparison,
    apart: Split | None,
    places: Sequence[Place],
    left_out: Sequence[Changed],
    against: Sequence[Changed],
) -> tuple[Part, ...]:
    return tuple(_part(comparison, apart, *three) for three in zip(places, left_out, against, strict=True))


def _part(comparison: Comparison, apart: Split | None, place: Place, one: Changed, other: Changed) -> Part:
    share: tuple[float | None, float | None, float | None] = (None, None, None)
    if apart is not None and apart.how.established:
        share = apart.share(place.flags)
    loss = _difference(one.change, other.change)
    without = None if loss is None else (comparison.ln_bayes_factor or 0.0) - loss
    shapes = [item.k_hat for item in (one, other) if item.k_hat is not None and np.isfinite(item.k_hat)]
    return Part(
        place.region,
        place.number,
        place.low,
        place.high,
        place.observed,
        *share,
        without,
        _error(one.error, other.error, loss),
        loss,
        _error(one.change_error, other.change_error, loss),
        next(way for way in (AFRESH, REWEIGHTED, EXACT) if way in {one.way, other.way}),
        max(shapes, default=None),
    )


def _holds(side: Side, against: Side) -> tuple[Hold, ...]:
    """Return every uncertainty of either hypothesis, the first one's first."""
    kinds = {name: held.kind for item in (against, side) for name, held in item.held.items()}
    return tuple(_hold(name, kind, side, against) for name, kind in kinds.items())


def _hold(name: str, kind: str, side: Side, against: Side) -> Hold:
    held = [_held(item, name, kind) for item in (side, against)]
    frozen = _ln_bayes_factor(held[0].frozen, held[1].frozen)
    return Hold(name, kind, *frozen, *_ln_bayes_factor(held[0].doubled, held[1].doubled))


def _held(side: Side, name: str, kind: str) -> Held:
    """Return a hypothesis' evidences; those that stand where it does not use the uncertainty."""
    same = unchanged(side.evidence)
    return side.held.get(name, Held(kind, same, same))


def _ln_bayes_factor(one: Changed | None, other: Changed | None) -> tuple[float | None, float | None]:
    if one is None or other is None:
        return None, None
    value = _difference(one.ln_evidence, other.ln_evidence)
    return value, _error(one.error, other.error, value)


def _difference(one: float | None, other: float | None) -> float | None:
    return None if one is None or other is None else one - other


def _error(one: float | None, other: float | None, value: float | None) -> float | None:
    return None if value is None else float(np.hypot(one or 0.0, other or 0.0))
