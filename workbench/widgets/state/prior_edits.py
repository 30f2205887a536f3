"""Edits of priors: another family, other numbers; and the numbers to begin another family with."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass, fields, replace

from workbench.errors import InputError
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.faults import KeyPath, dotted
from workbench.hypotheses.file.keys import Findings, Section
from workbench.hypotheses.file.priors import read_prior
from workbench.hypotheses.frozen import FrozenMapping
from workbench.hypotheses.priors import FAMILIES, Prior
from workbench.widgets.state.edits import with_parameter

DIGITS = 3  # of the numbers that another family begins with


@dataclass(frozen=True, slots=True)
class PriorOfParameter:
    """Another prior for a parameter.

    Attributes:
        parameter: its name.
        family: the family's name as in an analysis file.
        numbers: the family's numbers by name; those that may be left out are, where they are not wanted.
    """

    parameter: str
    family: str
    numbers: Mapping[str, float]

    def __post_init__(self) -> None:
        object.__setattr__(self, "numbers", FrozenMapping(self.numbers))

    @property
    def control(self) -> KeyPath:
        """Return the key of the prior: family and numbers are one control."""
        return ("parameters", self.parameter, "prior")

    @property
    def words(self) -> str:
        """Return what is changed."""
        return f"the prior of {self.parameter}"

    def made(self, analysis: Analysis) -> Analysis:
        """Return the analysis with that prior, read and refused as in a file."""
        parameter = analysis.parameter(self.parameter)
        findings = Findings(dotted)
        content = {"prior": {self.family: dict(self.numbers)}}
        prior = read_prior(Section(content, self.control[:2], findings))
        if prior is None or findings.problems:
            raise InputError(*findings.problems)
        return with_parameter(analysis, replace(parameter, prior=prior))

    def with_number(self, name: str, number: float | None) -> PriorOfParameter:
        """Return the edit with another number, or without it."""
        kept = {key: value for key, value in self.numbers.items() if key != name}
        return replace(self, numbers=kept if number is None else kept | {name: number})


@dataclass(frozen=True, slots=True)
class NumberOfFamily:
    """A number that a prior family takes.

    Attributes:
        name: as in an analysis file.
        may_be_left_out: whether the family does without it.
    """

    name: str
    may_be_left_out: bool


def numbers_of_family(family: str) -> tuple[NumberOfFamily, ...]:
    """Return the numbers that a family takes, in the order in which they are written."""
    return tuple(NumberOfFamily(one.name, one.default is None) for one in fields(FAMILIES[family]))


def numbers_of(prior: Prior) -> dict[str, float]:
    """Return a prior's numbers by name, without those that it does without."""
    given = {one.name: getattr(prior, one.name) for one in fields(prior)}
    return {name: float(value) for name, value in given.items() if value is not None}


def in_family(prior: Prior, family: str) -> Prior:
    """Return a prior of another family that says about the same, to begin with.

    Where the family can, it keeps the range, and the mean and standard deviation; else as near as it can. A
    parameter that was held at x gets a standard deviation of |x|/10, or 1 where it was held at 0.

    Args:
        prior: the prior at hand.
        family: the name of the family wanted.

    Returns:
        A prior of that family, with numbers of three digits; the prior itself if it is of that family.

    Source:
        none, definition
    """
    if prior.family == family:
        return prior
    numbers = _BEGINNINGS[family](_Rough.of(prior))
    made = FAMILIES[family]
    try:
        return made(**{name: float(f"{number:.{DIGITS}g}") for name, number in numbers.items()})
    except InputError:  # three digits don't tell the ends of a narrow range apart
        return made(**numbers)


@dataclass(frozen=True, slots=True)
class _Rough:
    """What other families are made to agree with; `size`, `median` and `factor` suit those above 0."""

    mean: float
    sd: float
    low: float
    high: float
    ends: dict[str, float]

    @classmethod
    def of(cls, prior: Prior) -> _Rough:
        mean, sd = prior.moments
        low, high = prior.support
        if sd == 0.0:
            sd = 0.1 * abs(mean) or 1.0
            low, high = (0.0 if mean > 0.0 else -math.inf), math.inf
        ends = {name: end for name, end in (("low", low), ("high", high)) if math.isfinite(end)}
        near = (mean - 2.0 * sd, mean + 2.0 * sd)
        if len(ends) < 2:  # a prior that falls off by itself is no range
            low, high = max(low, near[0]), min(high, near[1])
        return cls(mean, sd, low, high, ends)

    @property
    def size(self) -> float:
        return self.mean if self.mean > 0.0 else abs(self.mean) + self.sd

    @property
    def median(self) -> float:
        return self.size / math.sqrt(1.0 + (self.sd / self.size) ** 2)

    @property
    def factor(self) -> float:
        return math.exp(math.sqrt(math.log1p((self.sd / self.size) ** 2)))


def _loguniform(rough: _Rough) -> dict[str, float]:
    if rough.ends.get("high", 0.0) > 0.0:
        return {"low": rough.low if rough.low > 0.0 else 0.01 * rough.high, "high": rough.high}
    return {"low": rough.median / rough.factor**2, "high": rough.median * rough.factor**2}


def _beta(rough: _Rough) -> dict[str, float]:
    width = rough.high - rough.low
    place = (rough.mean - rough.low) / width
    spread = place * (1.0 - place) / (rough.sd / width) ** 2 - 1.0
    ends = {"low": rough.low, "high": rough.high}
    if not 0.0 < spread < math.inf:
        return {"a": 1.0, "b": 1.0} | ends
    return {"a": place * spread, "b": (1.0 - place) * spread} | ends


_BEGINNINGS: Mapping[str, Callable[[_Rough], dict[str, float]]] = {
    "uniform": lambda rough: {"low": rough.low, "high": rough.high},
    "normal": lambda rough: {"mean": rough.mean, "sd": rough.sd} | rough.ends,
    "lognormal": lambda rough: {"median": rough.median, "factor": rough.factor},
    "gamma": lambda rough: {"shape": (rough.size / rough.sd) ** 2, "rate": rough.size / rough.sd**2},
    "exponential": lambda rough: {"mean": rough.size},
    "halfnormal": lambda rough: {"sd": rough.size * math.sqrt(0.5 * math.pi)},
    "loguniform": _loguniform,
    "beta": _beta,
    "fixed": lambda rough: {"value": rough.mean},
}
