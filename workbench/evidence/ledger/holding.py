"""One hypothesis' evidence with an uncertainty frozen, and with it twice as large."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from workbench.evidence.ledger.changes import Changed, afresh
from workbench.evidence.ledger.freedoms import Freedom, doubled, freedoms_of, frozen
from workbench.evidence.ledger.members import Member, average
from workbench.evidence.results import Evidence
from workbench.evidence.weigh import weigh_hypothesis
from workbench.likelihood.model import compile_model


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
    members: Sequence[Member], evidence: Evidence, seed: np.random.SeedSequence
) -> dict[str, Held]:
    """Return a hypothesis' evidences with each of its uncertainties frozen and doubled, all made afresh.

    The draws that stand can't be used: where the counts say little of an uncertainty, a prior twice as wide
    gives weights without a variance.

    Args:
        members: the hypothesis' alternatives; one that does not use an uncertainty keeps its evidence.
        evidence: its evidence.
        seed: where the random numbers come from.

    Returns:
        Name to evidences, for every source, nuisance parameter and distortion that the hypothesis uses.
    """
    used = [{one.name: one for one in freedoms_of(member.model)} for member in members]
    kinds = {name: one.kind for freedoms in used for name, one in freedoms.items()}
    found = {}
    for (name, kind), child in zip(kinds.items(), seed.spawn(len(kinds)), strict=True):
        frozen_ones, doubled_ones = [], []
        for member, freedoms, own in zip(members, used, child.spawn(len(members)), strict=True):
            first, second = own.spawn(2)
            uses = freedoms.get(name)
            frozen_ones.append(_frozen(member, uses, first))
            doubled_ones.append(_doubled(member, uses, second))
        known = [one for one in doubled_ones if one is not None]
        found[name] = Held(
            kind,
            afresh(evidence, average(evidence, members, frozen_ones)),
            afresh(evidence, average(evidence, members, known)) if len(known) == len(members) else None,
        )
    return found


def _frozen(member: Member, freedom: Freedom | None, seed: np.random.SeedSequence) -> Evidence:
    if freedom is None:
        return member.evidence
    less = compile_model(frozen(member.model, freedom), member.model.hypothesis)
    return weigh_hypothesis(less, seed, near=member.near).evidence


def _doubled(member: Member, freedom: Freedom | None, seed: np.random.SeedSequence) -> Evidence | None:
    if freedom is None:
        return member.evidence
    more = doubled(member.model, freedom)
    return None if more is None else weigh_hypothesis(more, seed, near=member.near).evidence
