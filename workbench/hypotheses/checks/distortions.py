"""What can be wrong with the smooth distortion of a hypothesis."""

from __future__ import annotations

from collections.abc import Iterator

from workbench.errors import quoted
from workbench.hypotheses.declared import Declared
from workbench.hypotheses.distortion import (
    DEFAULT_TERMS,
    LARGEST_SIZE,
    MOST_TERMS,
    Distortion,
    regions_distorted,
    term_names,
)
from workbench.hypotheses.faults import Fault, KeyPath, shown
from workbench.hypotheses.hypothesis import Hypothesis
from workbench.hypotheses.unknown_names import unknown_fault


def distortion_faults(name: str, hypothesis: Hypothesis, declared: Declared) -> Iterator[Fault]:
    """Yield what is wrong with a hypothesis' distortion; nothing where it has none."""
    distortion = hypothesis.distortion
    if distortion is None:
        return
    path: KeyPath = ("hypotheses", name, "distortion")
    yield from _number_faults(path, distortion)
    yield from _region_faults(path, distortion, declared)
    given = [declared.processes.get(process) for process in hypothesis.processes]
    processes = [process for process in given if process is not None]
    if len(processes) < len(given) or not processes or distortion.regions == ():
        return  # told elsewhere
    acted = regions_distorted(distortion, processes, declared.regions)
    if not acted and all(one in declared.regions for one in distortion.regions or ()):
        yield Fault(
            path,
            "A distortion that acts nowhere",
            f"no background of this hypothesis in {'these regions' if distortion.regions else 'any region'}",
            "a background to distort",
            "list a background in processes, or leave the distortion out",
        )
    for region in acted:
        yield from _terms_in_region(path, distortion, region, declared)


def _number_faults(path: KeyPath, distortion: Distortion) -> Iterator[Fault]:
    if not 0.0 < distortion.size <= LARGEST_SIZE:
        yield Fault(
            (*path, "size"),
            "A distortion's size out of its range",
            shown(distortion.size),
            "a relative size above 0 and at most 1: 0.05 is five per cent",
            f"write {shown(distortion.size / 100.0)} if {shown(distortion.size)} % is meant"
            if LARGEST_SIZE < distortion.size <= 100.0
            else "write a size such as 0.05",
        )
    if not _is_number_of_terms(distortion.terms):
        yield Fault(
            (*path, "terms"),
            "A number of terms out of its range",
            shown(distortion.terms),
            f"a whole number from 1 to {MOST_TERMS}",
            f"write {DEFAULT_TERMS}: level, tilt and bow",
        )


def _is_number_of_terms(terms: float) -> bool:
    return not isinstance(terms, bool) and terms in range(1, MOST_TERMS + 1)


def _region_faults(path: KeyPath, distortion: Distortion, declared: Declared) -> Iterator[Fault]:
    if distortion.regions is not None and not distortion.regions:
        yield Fault(
            (*path, "regions"),
            "A distortion limited to no region",
            "[]",
            "at least one region",
            "name a region, or leave regions out for all",
        )
    for place, region in enumerate(distortion.regions or ()):
        if region not in declared.regions:
            yield unknown_fault((*path, "regions", place), "region", region, declared.regions)


def _terms_in_region(path: KeyPath, distortion: Distortion, name: str, declared: Declared) -> Iterator[Fault]:
    region = declared.regions[name]
    if region is None or not _is_number_of_terms(distortion.terms):
        return
    bins = region.table.binning.number
    if distortion.terms > bins:
        yield Fault(
            (*path, "terms"),
            "More terms of a distortion than bins",
            f"{distortion.terms} terms, {bins} in {quoted(name)}",
            "at most one term a bin",
            f"write terms = {bins}, or limit the distortion with regions",
        )
    for term in term_names(name, distortion.terms):
        for kind, taken in (("parameters", declared.parameters), ("uncertainties", declared.uncertainties)):
            if term in taken:
                yield Fault(
                    (kind, term),
                    "A name that is reserved",
                    quoted(term),
                    "another name: this one is a term of a distortion",
                    "rename it",
                )
