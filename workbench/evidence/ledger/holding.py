"""One hypothesis' evidence with an uncertainty frozen, and with it twice as large."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from workbench.evidence.ledger.changes import Changed, afresh
from workbench.evidence.ledger.freedoms import doubled, freedoms_of, frozen
from workbench.evidence.results import Evidence
from workbench.evidence.weigh import weigh_hypothesis
from workbench.likelihood.model import Model, compile_model

_NOWHERE: Mapping[str, float] = {}


@dataclass(frozen=True, slots=True)
class Held:
    """The evidences of one hypothesis with one uncertainty frozen and doubled.

    Attributes:
        kind: "source", "nuisance parameter" or "distortion".
        frozen: with it held at the middle of its prior.
        doubled: with it twice as large; None where its prior has no width to double.
    """

    kind: str
    frozen: Changed
    doubled: Changed | None


def held_evidences(
    model: Model,
    evidence: Evidence,
    seed: np.random.SeedSequence,
    near: Mapping[str, float] = _NOWHERE,
) -> dict[str, Held]:
    """Return a hypothesis' evidences with each of its uncertainties frozen and doubled, all made afresh.

    The draws that stand can't be used: where the counts say little of an uncertainty, a prior twice as wide
    gives weights without a variance.

    Args:
        model: the compiled hypothesis.
        evidence: its evidence.
        seed: where the random numbers come from.
        near: standard coordinates by name to start from.

    Returns:
        Name to evidences, for every source, nuisance parameter and distortion that the hypothesis uses.
    """
    found = {}
    freedoms = freedoms_of(model)
    for freedom, child in zip(freedoms, seed.spawn(len(freedoms)), strict=True):
        first, second = child.spawn(2)
        less = compile_model(frozen(model, freedom), model.hypothesis)
        more = doubled(model, freedom)
        found[freedom.name] = Held(
            freedom.kind,
            afresh(evidence, weigh_hypothesis(less, first, near=near)),
            None if more is None else afresh(evidence, weigh_hypothesis(more, second, near=near)),
        )
    return found
