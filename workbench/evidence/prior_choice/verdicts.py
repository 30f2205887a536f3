"""Where the Bayes factor passes the boundaries of a published scale, and the prior probability it needs."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from workbench.evidence.formulas.needed_prior import least_prior
from workbench.evidence.formulas.scales import Scale
from workbench.evidence.prior_choice.averages import Average

Array = npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Crossing:
    """A mean of a family at which ln B passes a boundary.

    Attributes:
        family: the family's name.
        boundary: ln B there; below 0 in favour of the other hypothesis [nats].
        mean: the prior's mean.
        error: one standard error of it, numerical.
        is_rising: True where ln B grows with the mean.
    """

    family: str
    boundary: float
    mean: float
    error: float
    is_rising: bool


@dataclass(frozen=True, slots=True)
class NeededPrior:
    """The least prior probability from which a wanted posterior is reached.

    Attributes:
        by: what B is taken from: "as declared" or the name of a bound.
        ln_bayes_factor: ln B [nats].
        probability, error: the least prior probability and its numerical standard error.
    """

    by: str
    ln_bayes_factor: float
    probability: float
    error: float


def crossings(family: str, means: Array, averages: Sequence[Average], scale: Scale) -> tuple[Crossing, ...]:
    """Return every mean at which ln B passes a boundary of a scale, for either hypothesis.

    Args:
        family: the family's name.
        means: (mean,) ascending.
        averages: ln B at each.
        scale: whose boundaries.

    Returns:
        Crossings by boundary, then by mean; straight lines in ln mean between neighbours.
    """
    values = np.array([np.nan if a.ln_bayes_factor is None else a.ln_bayes_factor for a in averages])
    errors = np.array([0.0 if a.error is None else a.error for a in averages])
    found = []
    for boundary in sorted({sign * one for one in scale.boundaries for sign in (-1.0, 1.0)}):
        above = values >= boundary
        for place in np.flatnonzero(np.diff(above.astype(int))):
            low, high = values[place], values[place + 1]
            if not np.isfinite([low, high]).all():
                continue
            step = float(np.log(means[place + 1] / means[place]))
            slope = (high - low) / step
            mean = float(means[place] * np.exp((boundary - low) / slope))
            error = mean * float(max(errors[place], errors[place + 1]) / abs(slope))
            found.append(Crossing(family, boundary, mean, error, bool(high > low)))
    return tuple(found)


def needed_prior(by: str, ln_bayes_factor: float, error: float, posterior: float) -> NeededPrior:
    """Return the least prior probability for a wanted posterior, with its error.

    Args:
        by: what B is taken from.
        ln_bayes_factor: ln B [nats].
        error: its numerical error [nats].
        posterior: the posterior wanted.
    """
    p = float(least_prior(ln_bayes_factor, posterior))
    return NeededPrior(by, ln_bayes_factor, p, p * (1.0 - p) * error)
