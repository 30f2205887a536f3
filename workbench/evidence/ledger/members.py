"""What a hypothesis is an average of: one model for each alternative of its backgrounds, most often one."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from workbench.evidence.averaging import averaged
from workbench.evidence.ledger.bridge import Rungs, rungs_of
from workbench.evidence.results import AlternativeEvidence, Evidence
from workbench.evidence.weigh import observed_counts
from workbench.hypotheses.alternatives import variants_of
from workbench.hypotheses.analysis import Analysis
from workbench.likelihood.model import Model, compile_model

Array = npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class Member:
    """One alternative of a hypothesis.

    Attributes:
        name: the alternative's name; empty where there is only one.
        prior: its prior probability given the hypothesis.
        model: the compiled hypothesis under it.
        evidence: its evidence.
        counts: (bin,) observed counts [events].
        rungs: the laws that its draws come from; None without free coordinates, or where none can be made.
    """

    name: str
    prior: float
    model: Model
    evidence: Evidence
    counts: Array
    rungs: Rungs | None

    @property
    def near(self) -> dict[str, float]:
        """Return standard coordinates by name that another evidence can start from."""
        return {} if self.rungs is None else self.rungs.grid.mode


def members_of(analysis: Analysis, evidence: Evidence) -> list[Member]:
    """Return the alternatives of a hypothesis.

    Args:
        analysis: everything declared, with observed counts.
        evidence: the hypothesis' evidence, established; an average where it has alternatives.

    Returns:
        One member an alternative; a single one where there is no doubt.

    Raises:
        InputError: if a region has no observed counts.
    """
    known = {one.name: one.evidence for one in evidence.alternatives}
    found = []
    for variant in variants_of(analysis, evidence.hypothesis):
        model = compile_model(variant.analysis, evidence.hypothesis)
        counts = observed_counts(model)
        rungs = rungs_of(model, counts) if model.size else None
        own = known.get(variant.name, evidence)
        found.append(Member(variant.name, variant.prior, model, own, counts, rungs))
    return found


def average(evidence: Evidence, members: Sequence[Member], others: Sequence[Evidence]) -> Evidence:
    """Return the evidence of a hypothesis from its members', one each."""
    parts = [
        AlternativeEvidence(member.name, member.prior, other)
        for member, other in zip(members, others, strict=True)
    ]
    return averaged(evidence.hypothesis, parts)
