"""The free directions of a hypothesis: its parameters in declaration order, then its sources."""

from __future__ import annotations

from dataclasses import dataclass

from workbench.hypotheses.analysis import Analysis, Parameter
from workbench.hypotheses.priors import Normal, Prior
from workbench.hypotheses.processes import Process

_SOURCE_PRIOR = Normal(mean=0.0, sd=1.0)


@dataclass(frozen=True, slots=True)
class Coordinate:
    """One free direction of a hypothesis.

    Attributes:
        name, unit: the parameter or source it belongs to.
        role: "signal", "nuisance" or "source".
        prior: its prior; a source's is the standard normal.
        is_strength: True for a signal parameter that only multiplies yields.
    """

    name: str
    unit: str
    role: str
    prior: Prior
    is_strength: bool = False


def coordinates_of(analysis: Analysis, hypothesis: str) -> tuple[Coordinate, ...]:
    """Return every free parameter of a hypothesis, then every source in use.

    Args:
        analysis: everything declared.
        hypothesis: the hypothesis' name.

    Returns:
        The coordinates in the order in which points hold them.

    Raises:
        InputError: if the analysis has no such hypothesis.
    """
    signal = set(analysis.signal_parameters(hypothesis))
    strengths = _strengths(analysis.processes_of(hypothesis))
    parameters = (analysis.parameter(name) for name in analysis.parameters_used(hypothesis))
    sources = analysis.sources_used(hypothesis)
    return (
        *(_coordinate(one, one.name in signal, one.name in strengths) for one in parameters),
        *(Coordinate(name, "", "source", _SOURCE_PRIOR) for name in sources),
    )


def _coordinate(parameter: Parameter, is_signal: bool, is_strength: bool) -> Coordinate:
    role = "signal" if is_signal else "nuisance"
    return Coordinate(parameter.name, parameter.unit, role, parameter.prior, is_signal and is_strength)


def _strengths(processes: tuple[Process, ...]) -> set[str]:
    """Return the names that only multiply yields: in `factors` and in no yield or shape."""
    factors = {f for process in processes for f in process.factors if isinstance(f, str)}
    elsewhere = {
        name
        for process in processes
        for contribution in process.regions.values()
        for name in contribution.parameters
    }
    return factors - elsewhere
