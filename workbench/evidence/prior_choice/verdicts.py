"""Where the Bayes factor passes the boundaries of a published scale, and the prior probability it needs."""

from __future__ import annotations

import itertools
from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from workbench.evidence.formulas.needed_prior import least_prior
from workbench.evidence.formulas.scales import Scale
from workbench.evidence.prior_choice.averages import Average

Array = npt.NDArray[np.float64]
Range = tuple[float | None, float | None]

_HALVINGS = 4


@dataclass(frozen=True, slots=True)
class FamilyCurve:
    """ln B against the mean of one family's members.

    Attributes:
        name, words: the family.
        averages: ln B, one a mean.
    """

    name: str
    words: str
    averages: tuple[Average, ...]


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


def crossings(
    family: str, means: Array, averages: Sequence[Average], scale: Scale, at: Callable[[float], Average]
) -> tuple[Crossing, ...]:
    """Return every mean at which ln B passes a boundary of a scale, for either hypothesis.

    Args:
        family: the family's name.
        means: (mean,) ascending.
        averages: ln B at each.
        scale: whose boundaries.
        at: ln B at any other mean.

    Returns:
        Crossings by boundary, then by mean.
    """
    found = []
    for boundary in sorted({sign * one for one in scale.boundaries for sign in (-1.0, 1.0)}):
        above = np.array([_value(one) >= boundary for one in averages])
        for place in np.flatnonzero(above[1:] != above[:-1]).tolist():
            first = (float(np.log(means[place])), averages[place])
            second = (float(np.log(means[place + 1])), averages[place + 1])
            found.append(_crossing(family, boundary, first, second, at))
    return tuple(found)


def _crossing(
    family: str,
    boundary: float,
    first: tuple[float, Average],
    second: tuple[float, Average],
    at: Callable[[float], Average],
) -> Crossing:
    """Return the crossing between two (ln mean, ln B), halved a few times, then along a straight line."""
    is_rising = _value(second[1]) > _value(first[1])
    for _ in range(_HALVINGS):
        middle = 0.5 * (first[0] + second[0])
        found = at(float(np.exp(middle)))
        if (_value(found) >= boundary) == is_rising:
            second = (middle, found)
        else:
            first = (middle, found)
    low, high = _value(first[1]), _value(second[1])
    slope = (high - low) / (second[0] - first[0])
    is_steep = not np.isfinite(slope)
    place = 0.5 * (first[0] + second[0]) if is_steep else first[0] + (boundary - low) / slope
    spread = max(first[1].error or 0.0, second[1].error or 0.0)
    error = second[0] - first[0] if is_steep else spread / abs(slope)
    mean = float(np.exp(place))
    return Crossing(family, boundary, mean, mean * error, is_rising)


def _value(average: Average) -> float:
    return float("-inf") if average.ln_bayes_factor is None else average.ln_bayes_factor


def ranges(family: FamilyCurve, boundary: float, found: Sequence[Crossing]) -> tuple[Range, ...]:
    """Return the means at which ln B has passed a boundary: at least it, or at most where it is below 0.

    Args:
        family: the family with its averages.
        boundary: a boundary of a scale [nats].
        found: crossings, of this family and others.

    Returns:
        Ranges of the mean, ascending; an end that lies beyond the means examined is None.
    """
    own = sorted(one.mean for one in found if one.family == family.name and one.boundary == boundary)
    first = _value(family.averages[0])
    is_inside = first >= boundary if boundary > 0.0 else first <= boundary
    ends = [*([None] if is_inside else []), *own]
    pairs = itertools.zip_longest(ends[::2], ends[1::2])
    return tuple((low, high) for low, high in pairs)


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
