"""Everything declared: the analysis and its hypotheses."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from typing import Protocol, TypeVar

from workbench.counts.region import Region
from workbench.errors import Caution, InputError, Problem, nearest, quoted
from workbench.hypotheses.cautions import cautions_of
from workbench.hypotheses.checks import faults_of
from workbench.hypotheses.contents import digest_of_analysis
from workbench.hypotheses.declared import Declared
from workbench.hypotheses.distortion import regions_distorted, term_names
from workbench.hypotheses.effects import regions_acted_on
from workbench.hypotheses.exposure import EXPOSURE_SOURCE, Exposure
from workbench.hypotheses.faults import Fault, dotted
from workbench.hypotheses.hypothesis import Hypothesis
from workbench.hypotheses.parameters import Parameter
from workbench.hypotheses.priors import Fixed
from workbench.hypotheses.processes import Process
from workbench.hypotheses.uncertainties import Uncertainty

__all__ = ["EXPOSURE_SOURCE", "Analysis", "Exposure", "Hypothesis", "Parameter", "declared_analysis"]


class _Named(Protocol):
    @property
    def name(self) -> str: ...


Noun = TypeVar("Noun", bound=_Named)


@dataclass(frozen=True, slots=True, eq=False)
class Analysis:
    """Everything declared; equal to another when every declaration and every number is.

    Attributes:
        title: the analysis' title.
        regions, parameters, processes, uncertainties, hypotheses: by declaration order; no hypotheses at all
            stands for "background only" and "signal plus background", equally probable.
        exposure: what yields are proportional to; None if not said.

    Raises:
        InputError: with everything that is wrong.
    """

    title: str
    regions: tuple[Region, ...]
    parameters: tuple[Parameter, ...] = ()
    processes: tuple[Process, ...] = ()
    uncertainties: tuple[Uncertainty, ...] = ()
    hypotheses: tuple[Hypothesis, ...] = ()
    exposure: Exposure | None = None

    def __post_init__(self) -> None:
        for kind in ("regions", "parameters", "processes", "uncertainties", "hypotheses"):
            object.__setattr__(self, kind, tuple(getattr(self, kind)))
        faults = [*_duplicates(self), *faults_of(_declared(self))]
        if faults:
            raise InputError(*(fault.problem(dotted) for fault in faults))
        if not self.hypotheses:
            object.__setattr__(self, "hypotheses", default_hypotheses(self.processes))

    def __eq__(self, other: object) -> bool:
        return self.digest == other.digest if isinstance(other, Analysis) else NotImplemented

    def __hash__(self) -> int:
        return hash(self.digest)

    @property
    def digest(self) -> str:
        """Return "sha256:..." of the content: declarations and numbers, not file names or cautions."""
        return digest_of_analysis(self)

    @property
    def cautions(self) -> tuple[Caution, ...]:
        """Return what is worth knowing about the declarations, wherever they came from."""
        return cautions_of(self)

    def region(self, name: str) -> Region:
        """Return the region of that name, or raise an InputError."""
        return _named("region", name, self.regions)

    def parameter(self, name: str) -> Parameter:
        """Return the parameter of that name, or raise an InputError."""
        return _named("parameter", name, self.parameters)

    def process(self, name: str) -> Process:
        """Return the process of that name, or raise an InputError."""
        return _named("process", name, self.processes)

    def uncertainty(self, name: str) -> Uncertainty:
        """Return the source of uncertainty of that name, or raise an InputError."""
        return _named("uncertainty", name, self.uncertainties)

    def hypothesis(self, name: str) -> Hypothesis:
        """Return the hypothesis of that name, or raise an InputError."""
        return _named("hypothesis", name, self.hypotheses)

    def processes_of(self, hypothesis: str) -> tuple[Process, ...]:
        """Return the processes of a hypothesis, in declaration order."""
        listed = self.hypothesis(hypothesis).processes
        return tuple(process for process in self.processes if process.name in listed)

    def parameters_used(self, hypothesis: str) -> tuple[str, ...]:
        """Return the free parameters of a hypothesis: those its processes use, less those held.

        Args:
            hypothesis: the hypothesis' name.

        Returns:
            Names in declaration order.

        Raises:
            InputError: if there is no such hypothesis.

        Source:
            none, definition
        """
        used = {name for process in self.processes_of(hypothesis) for name in process.parameters}
        held = self.held_parameters(hypothesis)
        return tuple(one.name for one in self.parameters if one.name in used and one.name not in held)

    def held_parameters(self, hypothesis: str) -> dict[str, float]:
        """Return what a hypothesis holds at a number: by its `fix`, or by a prior that is fixed.

        Args:
            hypothesis: the hypothesis' name.

        Returns:
            Name to number, for the parameters that the hypothesis uses.

        Raises:
            InputError: if there is no such hypothesis.

        Source:
            none, definition
        """
        used = {name for process in self.processes_of(hypothesis) for name in process.parameters}
        fixed = {
            one.name: one.prior.value
            for one in self.parameters
            if one.name in used and isinstance(one.prior, Fixed)
        }
        return fixed | dict(self.hypothesis(hypothesis).fix)

    def signal_parameters(self, hypothesis: str) -> tuple[str, ...]:
        """Return the free parameters of a hypothesis that no background uses.

        Args:
            hypothesis: the hypothesis' name.

        Returns:
            Names in declaration order.

        Raises:
            InputError: if there is no such hypothesis.

        Source:
            none, definition: a parameter used by a background too is a nuisance parameter
        """
        backgrounds = (process for process in self.processes if not process.is_signal)
        shared = {name for process in backgrounds for name in process.parameters}
        return tuple(name for name in self.parameters_used(hypothesis) if name not in shared)

    def sources_used(self, hypothesis: str) -> tuple[str, ...]:
        """Return the sources of uncertainty that act on a hypothesis, those of its distortion last.

        Args:
            hypothesis: the hypothesis' name.

        Returns:
            Names in declaration order, then "exposure", then the terms of its distortion.

        Raises:
            InputError: if there is no such hypothesis.

        Source:
            none, definition
        """
        processes = {process.name: process for process in self.processes_of(hypothesis)}
        names = [
            source.name
            for source in self.uncertainties
            if any(
                effect.process in processes and regions_acted_on(effect, source, processes[effect.process])
                for effect in source.effects
            )
        ]
        has_exposure = self.exposure is not None and bool(self.exposure.uncertainty)
        if has_exposure and any(process.follows_exposure for process in processes.values()):
            names.append(EXPOSURE_SOURCE)
        return (*names, *(name for terms in self.distorted_regions(hypothesis).values() for name in terms))

    def distorted_regions(self, hypothesis: str) -> dict[str, tuple[str, ...]]:
        """Return the regions that a hypothesis distorts smoothly, each with the names of its terms.

        Args:
            hypothesis: the hypothesis' name.

        Returns:
            Region to source names, in the regions' order; nothing without a distortion.

        Raises:
            InputError: if there is no such hypothesis.

        Source:
            none, definition
        """
        distortion = self.hypothesis(hypothesis).distortion
        if distortion is None:
            return {}
        regions = [region.name for region in self.regions]
        acted = regions_distorted(distortion, self.processes_of(hypothesis), regions)
        return {region: term_names(region, distortion.terms) for region in acted}


def default_hypotheses(processes: Sequence[Process]) -> tuple[Hypothesis, ...]:
    """Return what left-out hypotheses stand for: the backgrounds, and everything, equally probable.

    Args:
        processes: every process of the analysis.

    Returns:
        "background only" and "signal plus background"; where one of them would be empty or both the same,
        only the other.

    Source:
        none, definition
    """
    everything = tuple(process.name for process in processes)
    backgrounds = tuple(process.name for process in processes if not process.is_signal)
    alternatives = []
    if backgrounds:
        alternatives.append(Hypothesis("background only", backgrounds, 0.5))
    if backgrounds != everything:
        alternatives.append(Hypothesis("signal plus background", everything, 0.5))
    return tuple(alternatives)


def declared_analysis(title: str, declared: Declared) -> Analysis:
    """Return the analysis of everything declared that could be read.

    Args:
        title: the analysis' title.
        declared: everything declared.

    Returns:
        The analysis.

    Raises:
        InputError: with everything that is wrong.
    """
    return Analysis(
        title=title,
        regions=_read(declared.regions.values()),
        parameters=_read(declared.parameters.values()),
        processes=_read(declared.processes.values()),
        uncertainties=_read(declared.uncertainties.values()),
        hypotheses=_read(declared.hypotheses.values()),
        exposure=declared.exposure,
    )


def _read(found: Iterable[Noun | None]) -> tuple[Noun, ...]:
    return tuple(one for one in found if one is not None)


def _declared(analysis: Analysis) -> Declared:
    return Declared(
        regions={one.name: one for one in analysis.regions},
        parameters={one.name: one for one in analysis.parameters},
        processes={one.name: one for one in analysis.processes},
        uncertainties={one.name: one for one in analysis.uncertainties},
        hypotheses={one.name: one for one in analysis.hypotheses},
        exposure=analysis.exposure,
    )


def _duplicates(analysis: Analysis) -> Iterator[Fault]:
    """Yield the faults of names given twice, which a file can't hold but Python can."""
    kinds: dict[str, Sequence[_Named]] = {
        "regions": analysis.regions,
        "parameters": analysis.parameters,
        "processes": analysis.processes,
        "uncertainties": analysis.uncertainties,
        "hypotheses": analysis.hypotheses,
    }
    for kind, given in kinds.items():
        names = [one.name for one in given]
        for name in sorted({name for name in names if names.count(name) > 1}):
            yield Fault(
                (kind, name),
                f"Two {kind} of the same name",
                f"{quoted(name)} {names.count(name)} times",
                "each name once",
                "rename one of them",
            )


def _named(kind: str, name: str, given: Sequence[Noun]) -> Noun:
    for one in given:
        if one.name == name:
            return one
    known = [one.name for one in given]
    raise InputError(
        Problem(
            f"No {kind} of this name",
            kind,
            quoted(name),
            f"a {kind} of the analysis",
            nearest(name, known),
        )
    )
