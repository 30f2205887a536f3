"""The Bayes factor under any prior of a strength: R averaged over it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.evidence.prior_choice.curve import LEAST_TOLD, StrengthCurve
from workbench.evidence.prior_choice.reference import ReferenceLike
from workbench.hypotheses.priors import Fixed, Prior

Array = npt.NDArray[np.float64]
StrengthPrior = Prior | ReferenceLike


@dataclass(frozen=True, slots=True)
class Average:
    """ln B under one prior.

    Attributes:
        ln_bayes_factor: ln B [nats]; None where it is below what is told apart.
        error: one standard error of it, numerical [nats]; None with it.
    """

    ln_bayes_factor: float | None
    error: float | None


def average(curve: StrengthCurve, prior: StrengthPrior) -> Average:
    """Return ln B under a prior of the strength.

    With F the prior's distribution function, summed over cells narrow beside what R does:
        B = int R(s) dF(s)

    Args:
        curve: ln R of the strength.
        prior: any proper prior of it.

    Returns:
        ln B with its error: that of R weighted by what each strength contributes (taken as the same for all,
        an upper limit), that of the other hypothesis, and what the prior holds beyond the curve.

    Source:
        None, definition of the marginal likelihood.
    """
    if isinstance(prior, Fixed):
        return told(float(curve.at(np.array(prior.value))), curve.error_at(prior.value))
    mass, beyond = masses(prior, curve.edges)
    top = float(curve.ln_cells.max())
    parts = mass * np.exp(curve.ln_cells - top)
    rest = beyond * float(np.exp(curve.at(np.array(curve.reach)) - top))
    total = float(parts.sum()) + (0.0 if curve.is_ended else rest)
    if total <= 0.0:
        return Average(None, None)
    lost = rest / total
    own = float((parts * curve.cell_errors).sum()) / total
    error = float(np.sqrt(own**2 + curve.against_error**2 + lost**2))
    return told(top + float(np.log(total)), error)


def told(ln_bayes_factor: float, error: float) -> Average:
    """Return an average, empty where it is below what is told apart."""
    return Average(ln_bayes_factor, error) if ln_bayes_factor > LEAST_TOLD else Average(None, None)


def masses(prior: StrengthPrior, edges: Array) -> tuple[Array, float]:
    """Return (cell,) prior probabilities between edges, and what lies beyond the last.

    Args:
        prior: a prior with a distribution function.
        edges: (cell + 1,) ascending.

    Returns:
        Probabilities without cancellation in either tail.
    """
    if isinstance(prior, ReferenceLike):
        below = prior.below(edges)
        return np.diff(below), float(1.0 - below[-1])
    t = prior.to_standard(edges)
    low, high = t[:-1], t[1:]
    upper = special.ndtr(-low) - special.ndtr(-high)
    lower = special.ndtr(high) - special.ndtr(low)
    return np.where(low > 0.0, upper, lower), float(special.ndtr(-t[-1]))
