"""Everything that can be wrong with an analysis as a whole, told at once."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping

from workbench.counts.magnitudes import LARGEST_FACTOR, is_workable
from workbench.errors import quoted
from workbench.hypotheses.checks.distortions import distortion_faults
from workbench.hypotheses.checks.processes import process_faults
from workbench.hypotheses.checks.uncertainties import overlarge_change, uncertainty_faults
from workbench.hypotheses.declared import Declared
from workbench.hypotheses.exposure import EXPOSURE_SOURCE, Exposure
from workbench.hypotheses.faults import Fault, KeyPath, number_fault, shown
from workbench.hypotheses.hypothesis import Hypothesis
from workbench.hypotheses.unknown_names import nearest_name, unknown_fault


def faults_of(declared: Declared) -> tuple[Fault, ...]:
    """Return everything that is wrong with what an analysis declares, each fault once.

    Args:
        declared: everything declared; content that could not be read is passed over.

    Returns:
        The faults, in the order of the file's parts.

    Source:
        none, definition
    """
    found = [
        *_empty_faults(declared),
        *_name_faults(declared),
        *_exposure_faults(declared.exposure),
        *process_faults(declared),
        *uncertainty_faults(declared),
        *_hypotheses_faults(declared),
    ]
    return tuple({(fault.path, fault.what): fault for fault in reversed(found)}.values())[::-1]


def _empty_faults(declared: Declared) -> Iterator[Fault]:
    for kind, given in (("regions", declared.regions), ("processes", declared.processes)):
        if not given:
            yield Fault((kind,), f"An analysis without {kind}", "none", "at least one", f"add [{kind}.NAME]")


def _name_faults(declared: Declared) -> Iterator[Fault]:
    kinds: dict[str, Mapping[str, object]] = {
        "regions": declared.regions,
        "parameters": declared.parameters,
        "processes": declared.processes,
        "uncertainties": declared.uncertainties,
        "hypotheses": declared.hypotheses,
    }
    for kind, given in kinds.items():
        for name in given:
            if not name.strip() or not name.isprintable():
                yield Fault(
                    (kind, name),
                    "A name that cannot be printed",
                    quoted(name),
                    "letters, digits, signs and spaces",
                    "give it a name that can be read on screen",
                )
    for name in declared.uncertainties:
        if name in declared.parameters:
            yield Fault(
                ("uncertainties", name),
                "A parameter and an uncertainty of the same name",
                quoted(name),
                "different names: each is one unknown number",
                "rename one of them",
            )
    for kind in ("parameters", "uncertainties"):
        if EXPOSURE_SOURCE in kinds[kind]:
            yield Fault(
                (kind, EXPOSURE_SOURCE),
                "A name that is reserved",
                quoted(EXPOSURE_SOURCE),
                "another name: this one is the uncertainty of the exposure",
                "rename it, or write exposure.uncertainty instead",
            )


def _exposure_faults(exposure: Exposure | None) -> Iterator[Fault]:
    if exposure is None:
        return
    if not (math.isfinite(exposure.collected) and exposure.collected > 0):
        yield Fault(
            ("exposure", "collected"),
            "An exposure that is not above 0",
            shown(exposure.collected),
            "a number > 0: yields are in proportion to it",
            "write the exposure that was collected",
        )
    size = exposure.uncertainty
    if size is not None and not (math.isfinite(size) and size >= 0):
        yield Fault(
            ("exposure", "uncertainty"),
            "An uncertainty of the exposure below 0",
            shown(size),
            "a relative size >= 0: 0.02 is two per cent",
            "write the size without a sign",
        )
    for key, number in (("collected", exposure.collected), ("uncertainty", size)):
        yield from _too_far(("exposure", key), number)
    if size is not None and is_workable(size) and size > LARGEST_FACTOR:
        yield overlarge_change(("exposure", "uncertainty"), size)


def _too_far(path: KeyPath, number: float | None) -> Iterator[Fault]:
    """Yield the fault of a finite number that is too large or too small to be worked with."""
    if number is not None and abs(number) < math.inf:
        fault = number_fault(path, number)
        if fault is not None:
            yield fault


def _hypotheses_faults(declared: Declared) -> Iterator[Fault]:
    for name, hypothesis in declared.hypotheses.items():
        if hypothesis is not None:
            yield from _hypothesis_faults(name, hypothesis, declared)
            yield from distortion_faults(name, hypothesis, declared)


def _hypothesis_faults(name: str, hypothesis: Hypothesis, declared: Declared) -> Iterator[Fault]:
    if not (math.isfinite(hypothesis.prior) and hypothesis.prior > 0):
        yield Fault(
            ("hypotheses", name, "prior"),
            "A prior probability that is not above 0",
            shown(hypothesis.prior),
            "a number > 0, relative to the other hypotheses",
            "write a number above 0, or leave out a hypothesis that is ruled out",
        )
    yield from _too_far(("hypotheses", name, "prior"), hypothesis.prior)
    if not hypothesis.processes:
        yield Fault(
            ("hypotheses", name, "processes"),
            "A hypothesis without processes",
            "an empty list",
            "at least one process",
            "list the processes that it is made of",
        )
    seen: set[str] = set()
    for place, process in enumerate(hypothesis.processes):
        path = ("hypotheses", name, "processes", place)
        if process not in declared.processes:
            yield unknown_fault(path, "process", process, declared.processes)
        elif process in seen:
            yield Fault(
                path,
                "A process listed twice",
                quoted(process),
                "each process once",
                "leave out the second; two of a kind are a factor 2",
            )
        seen.add(process)
    yield from _fix_faults(name, hypothesis, declared)


def _fix_faults(name: str, hypothesis: Hypothesis, declared: Declared) -> Iterator[Fault]:
    used: set[str] = set()
    are_read = True
    for process in hypothesis.processes:
        content = declared.processes.get(process)
        are_read = are_read and content is not None
        used |= set(content.parameters) if content is not None else set()
    for parameter, number in hypothesis.fix.items():
        path = ("hypotheses", name, "fix", parameter)
        if parameter not in declared.parameters:
            yield unknown_fault(path, "parameter", parameter, declared.parameters)
        elif are_read and parameter not in used:
            yield Fault(
                path,
                "A held parameter that the hypothesis does not use",
                quoted(parameter),
                "a parameter of one of its processes",
                nearest_name(parameter, used),
            )
        if not math.isfinite(number):
            yield Fault(
                path,
                "A held parameter without a finite value",
                shown(number),
                "a finite number",
                "write the value that it is held at",
            )
        yield from _too_far(path, number)
