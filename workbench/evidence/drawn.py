"""What an estimator that needs no grid answers: its evidence, its own doubt, and weighted draws."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy import special

Array = npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class Drawn:
    """An evidence with draws from the posterior.

    Attributes:
        name: the estimator's, "annealing" or "nested sampling".
        ln_evidence: ln Z [nats]; -inf where there is none.
        error: one standard error, from the spread between independent runs [nats].
        doubt: why these runs don't support each other; empty where they do.
        evaluations: points at which the likelihood was worked out.
        runs: (run,) ln Z of each independent run of the last round [nats].
        points: (draw, coordinate) standard coordinates.
        ln_weights: (draw,) each draw's weight in the posterior; the mean of their exponentials is the mean Z
            of the runs that they are from [nats].
    """

    name: str
    ln_evidence: float
    error: float
    doubt: str
    evaluations: int
    runs: Array
    points: Array
    ln_weights: Array


def nothing_drawn(name: str, size: int, doubt: str, evaluations: int = 0) -> Drawn:
    """Return what there is to say where no evidence could be made.

    Args:
        name: the estimator's.
        size: number of coordinates.
        doubt: why there is none.
        evaluations: points at which the likelihood was worked out.
    """
    none = np.zeros(0)
    return Drawn(name, -np.inf, np.inf, doubt, evaluations, none, np.zeros((0, size)), none)


def widened(runs: int) -> float:
    """Return by how much an error from the spread of so few runs has to be widened to hold 68 %.

    Args:
        runs: number of independent runs, at least 2.

    Source:
        Student, Biometrika 6 (1908) 1.
    """
    return float(special.stdtrit(runs - 1, special.ndtr(1.0)))
