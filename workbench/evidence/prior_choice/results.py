"""What an examination of the strength's prior, and of the nuisance priors, answers."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from workbench.errors import Caution
from workbench.evidence.prior_choice.averages import Average
from workbench.evidence.prior_choice.bounds import Bound
from workbench.evidence.prior_choice.curve import StrengthCurve
from workbench.evidence.prior_choice.local_p import LocalP
from workbench.evidence.prior_choice.powers import PowerScaling
from workbench.evidence.prior_choice.verdicts import Crossing, FamilyCurve, NeededPrior
from workbench.evidence.results import Comparison, Evidence

Array = npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class DeclaredPrior:
    """The strength's prior as the analysis has it.

    Attributes:
        text: in words.
        family: its family, as an analysis file names it.
        mean: its expectation.
        by_curve: ln B as the average of the curve over it, to hold against the evidence's own.
    """

    text: str
    family: str
    mean: float
    by_curve: Average


@dataclass(frozen=True, slots=True, eq=False)
class PriorSensitivity:
    """How a Bayes factor depends on the priors.

    Attributes:
        strength: the strength whose prior is varied.
        comparison: the hypothesis against the other one, as weighed.
        evidences: theirs, the other hypothesis' first.
        reason: why nothing is established; empty when it is.
        declared: the strength's prior as it stands.
        events: signal events that strength 1 predicts, at the medians of the other priors.
        curve: ln R of the strength; None where it cannot be had.
        means: (mean,) means at which the families are evaluated, in powers of 2^(1/6) of the declared one's.
        families: ln B of each family.
        bounds: the largest ln B of classes of priors, and by the p-value where there is one.
        local: the local p-value; None where there is none.
        crossings: where ln B passes the boundaries of the published scales, by the scale's name.
        posterior: the posterior probability that is wanted.
        needed: the prior probability that it asks for.
        scalings: every nuisance prior to powers, in declaration order.
        seed: where every random number came from.
        cautions: what a reader should know.
    """

    strength: str
    comparison: Comparison
    evidences: tuple[Evidence, Evidence]
    reason: str
    declared: DeclaredPrior
    events: float
    curve: StrengthCurve | None
    means: Array
    families: tuple[FamilyCurve, ...]
    bounds: tuple[Bound, ...]
    local: LocalP | None
    crossings: dict[str, tuple[Crossing, ...]]
    posterior: float
    needed: tuple[NeededPrior, ...]
    scalings: tuple[PowerScaling, ...]
    seed: int
    cautions: tuple[Caution, ...] = ()

    @property
    def established(self) -> bool:
        """Return True when the evidences and the curve are."""
        return not self.reason
