"""Families of priors on a strength, each with one number left: its mean."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from types import MappingProxyType

import numpy as np

from workbench.evidence.prior_choice.averages import StrengthPrior
from workbench.evidence.prior_choice.reference import ReferenceFamily
from workbench.hypotheses.priors import (
    Exponential,
    Fixed,
    Gamma,
    HalfNormal,
    LogNormal,
    LogUniform,
    Prior,
    Uniform,
)

DECADES = 2.0
GAMMA_SHAPE = 2.0
ONE_SD = 2.0  # what one standard deviation of the log-normal multiplies by
REFERENCE = "reference-like"

_MADE: Mapping[str, tuple[str, Callable[[float], Prior]]] = MappingProxyType(
    {
        "point": ("all at one strength", Fixed),
        "log-normal": (
            f"one standard deviation a factor {ONE_SD:g}",
            lambda mean: LogNormal(mean * float(np.exp(-0.5 * np.log(ONE_SD) ** 2)), ONE_SD),
        ),
        "gamma": (
            f"shape {GAMMA_SHAPE:g}: 0 at 0",
            lambda mean: Gamma(GAMMA_SHAPE, GAMMA_SHAPE / mean),
        ),
        "uniform": ("from 0 to twice the mean", lambda mean: Uniform(0.0, 2.0 * mean)),
        "half-normal": ("around 0", lambda mean: HalfNormal(mean * float(np.sqrt(0.5 * np.pi)))),
        "exponential": ("", Exponential),
        "log-uniform": (
            f"over {DECADES:g} decades",
            lambda mean: LogUniform(_top(mean) * 10.0**-DECADES, _top(mean)),
        ),
    }
)


@dataclass(frozen=True, slots=True)
class Family:
    """One family of priors on a strength.

    Attributes:
        name: what it is called.
        words: what its members have in common beside the name.
        member: makes the member with a given mean.
    """

    name: str
    words: str
    member: Callable[[float], StrengthPrior]


def families(reference: ReferenceFamily) -> tuple[Family, ...]:
    """Return the families, from what is concentrated at its mean to what is most spread out.

    Args:
        reference: the reference-like density of the analysis.
    """
    made = [Family(name, words, member) for name, (words, member) in _MADE.items()]
    like = Family(REFERENCE, "1/sqrt(strength + background), cut off and normalised", reference.with_mean)
    place = [family.name for family in made].index("exponential")
    return (*made[:place], like, *made[place:])


def _top(mean: float) -> float:
    """Return the upper end of a log-uniform prior with a given mean."""
    return float(mean * DECADES * np.log(10.0) / (1.0 - 10.0**-DECADES))
