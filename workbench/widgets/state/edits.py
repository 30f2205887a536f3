"""Edits of hypotheses: processes in and out, prior probabilities, held parameters; and of the exposure.

An edit is a value: it knows the control that asks for it, its name for the list of what can be undone, and
the analysis that it makes of another. The analysis itself refuses what is wrong, in the terminal's words.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Protocol, TypeVar

from workbench.errors import InputError, Problem
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.faults import KeyPath
from workbench.hypotheses.hypothesis import Hypothesis
from workbench.hypotheses.parameters import Parameter
from workbench.hypotheses.uncertainties import Uncertainty

Noun = TypeVar("Noun", Hypothesis, Parameter, Uncertainty)


class Edit(Protocol):
    """One change of an analysis that a control asks for."""

    @property
    def control(self) -> KeyPath:
        """Return the key that the control stands for."""

    @property
    def words(self) -> str:
        """Return what is changed, in words that go after "undo"."""

    def made(self, analysis: Analysis) -> Analysis:
        """Return the analysis with the change in it.

        Raises:
            InputError: with everything that is wrong with it.
        """


@dataclass(frozen=True, slots=True)
class ProcessOfHypothesis:
    """A process taken into a hypothesis, or out of it.

    Attributes:
        hypothesis, process: their names.
        is_in: whether the hypothesis shall have the process.
    """

    hypothesis: str
    process: str
    is_in: bool

    @property
    def control(self) -> KeyPath:
        """Return the key of the hypothesis' list, and the process."""
        return ("hypotheses", self.hypothesis, "processes", self.process)

    @property
    def words(self) -> str:
        """Return what is changed."""
        return f"{self.process} {'into' if self.is_in else 'out of'} {self.hypothesis}"

    def made(self, analysis: Analysis) -> Analysis:
        """Return the analysis with the process in or out; a new one stands where it is declared."""
        hypothesis = analysis.hypothesis(self.hypothesis)
        declared = [one.name for one in analysis.processes]
        analysis.process(self.process)
        listed = [one for one in hypothesis.processes if one != self.process]
        if self.is_in == (self.process in hypothesis.processes):
            return analysis
        if self.is_in:
            place = declared.index(self.process)
            later = [at for at, one in enumerate(listed) if declared.index(one) > place]
            listed.insert(later[0] if later else len(listed), self.process)
        return with_hypothesis(analysis, replace(hypothesis, processes=tuple(listed)))


@dataclass(frozen=True, slots=True)
class PriorProbability:
    """Another prior probability for a hypothesis, relative to the other hypotheses'.

    Attributes:
        hypothesis: its name.
        prior: the number; > 0.
    """

    hypothesis: str
    prior: float

    @property
    def control(self) -> KeyPath:
        """Return the key of the prior probability."""
        return ("hypotheses", self.hypothesis, "prior")

    @property
    def words(self) -> str:
        """Return what is changed."""
        return f"the prior probability of {self.hypothesis}"

    def made(self, analysis: Analysis) -> Analysis:
        """Return the analysis with that prior probability."""
        hypothesis = analysis.hypothesis(self.hypothesis)
        return with_hypothesis(analysis, replace(hypothesis, prior=float(self.prior)))


@dataclass(frozen=True, slots=True)
class HeldParameter:
    """A parameter held at a number under one hypothesis, or set free.

    Attributes:
        hypothesis, parameter: their names.
        value: the number that it is held at; None to set it free.
    """

    hypothesis: str
    parameter: str
    value: float | None

    @property
    def control(self) -> KeyPath:
        """Return the key of the held parameter."""
        return ("hypotheses", self.hypothesis, "fix", self.parameter)

    @property
    def words(self) -> str:
        """Return what is changed."""
        verb = "setting free" if self.value is None else "holding"
        return f"{verb} {self.parameter} in {self.hypothesis}"

    def made(self, analysis: Analysis) -> Analysis:
        """Return the analysis with the parameter held or free."""
        hypothesis = analysis.hypothesis(self.hypothesis)
        fix = dict(hypothesis.fix)
        if self.value is None:
            fix.pop(self.parameter, None)
        else:
            fix[self.parameter] = float(self.value)
        return with_hypothesis(analysis, replace(hypothesis, fix=fix))


@dataclass(frozen=True, slots=True)
class ExposureUncertainty:
    """Another relative uncertainty of the exposure.

    Attributes:
        size: relative size, 0.02 for two per cent; None for none.
    """

    size: float | None

    @property
    def control(self) -> KeyPath:
        """Return the key of the exposure's uncertainty."""
        return ("exposure", "uncertainty")

    @property
    def words(self) -> str:
        """Return what is changed."""
        return "the uncertainty of the exposure"

    def made(self, analysis: Analysis) -> Analysis:
        """Return the analysis with that uncertainty of its exposure."""
        if analysis.exposure is None:
            raise InputError(
                Problem(
                    "An uncertainty of an exposure that is not declared",
                    "exposure",
                    "no exposure",
                    "the exposure that was collected",
                    "add [exposure] with collected = NUMBER to the analysis file",
                )
            )
        size = None if self.size is None else float(self.size)
        return replace(analysis, exposure=replace(analysis.exposure, uncertainty=size))


def with_hypothesis(analysis: Analysis, changed: Hypothesis) -> Analysis:
    """Return the analysis with another hypothesis of the same name."""
    return replace(analysis, hypotheses=_with(analysis.hypotheses, changed))


def with_parameter(analysis: Analysis, changed: Parameter) -> Analysis:
    """Return the analysis with another parameter of the same name."""
    return replace(analysis, parameters=_with(analysis.parameters, changed))


def _with(given: tuple[Noun, ...], changed: Noun) -> tuple[Noun, ...]:
    return tuple(changed if one.name == changed.name else one for one in given)
