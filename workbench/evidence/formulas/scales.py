"""Published scales of the Bayes factor, and odds as probabilities.

A scale is a set of boundaries to draw on a ruler. The words that its authors chose are kept beside them,
because a reader may ask; no result of ours is described with them.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy import special

Array = npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Scale:
    """Boundaries of the Bayes factor that somebody published.

    Attributes:
        name: whose scale.
        boundaries: ln B at each boundary, ascending, for evidence in favour [nats].
        grades: the authors' words between them; one more than boundaries.
        source: where it is printed.
    """

    name: str
    boundaries: tuple[float, ...]
    grades: tuple[str, ...]
    source: str

    def grade(self, ln_bayes_factor: float) -> int:
        """Return how many boundaries a weight of evidence has passed, for or against.

        Args:
            ln_bayes_factor: ln B [nats]; its sign does not matter.

        Returns:
            0 below the first boundary, up to the number of boundaries.

        Source:
            None, definition; a value on a boundary has passed it.
        """
        return sum(abs(ln_bayes_factor) >= boundary for boundary in self.boundaries)


KASS_RAFTERY = Scale(
    name="Kass and Raftery",
    boundaries=(1.0, 3.0, 5.0),
    grades=("not worth more than a bare mention", "positive", "strong", "very strong"),
    source="R.E. Kass and A.E. Raftery, J. Am. Stat. Assoc. 90 (1995) 773, section 3.2: 2 ln B = 2, 6, 10",
)

JEFFREYS = Scale(
    name="Jeffreys",
    boundaries=tuple(0.5 * step * float(np.log(10.0)) for step in (1, 2, 3, 4)),
    grades=("not worth more than a bare mention", "substantial", "strong", "very strong", "decisive"),
    source="H. Jeffreys, Theory of Probability, 3rd ed. (1961), appendix B: log10 B = 1/2, 1, 3/2, 2",
)

TROTTA = Scale(
    name="Trotta",
    boundaries=(1.0, 2.5, 5.0),
    grades=("inconclusive", "weak", "moderate", "strong"),
    source="R. Trotta, Contemp. Phys. 49 (2008) 71, table 1: ln B = 1, 2.5, 5; from memory",
)

SCALES = (KASS_RAFTERY, JEFFREYS, TROTTA)


def probability(odds: npt.ArrayLike) -> Array:
    """Return odds as a probability.

    P = odds/(1 + odds)

    Args:
        odds: (...) odds in favour; >= 0.

    Returns:
        (...) probability.

    Source:
        None, definition.
    """
    value = np.asarray(odds, dtype=float)
    return np.asarray(value / (1.0 + value))


def probability_from_ln(ln_odds: npt.ArrayLike) -> Array:
    """Return ln odds as a probability, for odds too large or small to write down.

    P = 1/(1 + exp(-ln odds))

    Args:
        ln_odds: (...) ln odds in favour [nats].

    Returns:
        (...) probability.

    Source:
        None, definition.
    """
    return np.asarray(special.expit(np.asarray(ln_odds, dtype=float)))


def decibans(nats: npt.ArrayLike) -> Array:
    """Return a weight of evidence in decibans, ten times its decimal logarithm.

    Args:
        nats: (...) ln B [nats].

    Returns:
        (...) 10 log10 B [decibans].

    Source:
        I.J. Good, Probability and the Weighing of Evidence (1950), after A.M. Turing; from memory.
    """
    return np.asarray(np.asarray(nats, dtype=float) * (10.0 / np.log(10.0)))
