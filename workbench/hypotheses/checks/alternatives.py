"""What can be wrong with the alternatives of a process."""

from __future__ import annotations

import math
from collections.abc import Iterator

from workbench.counts.magnitudes import is_workable
from workbench.errors import quoted, shortened
from workbench.hypotheses.declared import Declared
from workbench.hypotheses.faults import Fault, KeyPath, number_fault, shown
from workbench.hypotheses.processes import Alternative, Process

MOST_CHOICES = 64


def alternative_faults(path: KeyPath, process: Process) -> Iterator[Fault]:
    """Yield what is wrong with the alternatives of a process as such; their contents are looked at apart.

    Args:
        path: the process' key path.
        process: the process.

    Yields:
        Each fault.
    """
    if not process.alternatives:
        return
    inside = (*path, "alternatives")
    if process.is_signal:
        yield Fault(
            inside,
            "Alternatives of a signal",
            f"{quoted(process.name)}, a signal",
            "a background: one in doubt is averaged over",
            "declare two signal processes, and a hypothesis for each",
        )
    names = [one.name for one in process.alternatives]
    if len(names) < 2:
        yield Fault(
            inside,
            "A choice among fewer than two",
            f"{quoted(names[0])} alone",
            "at least two alternatives",
            "add one, or describe the process under regions instead",
        )
    for name in sorted({name for name in names if names.count(name) > 1}):
        yield Fault(
            (*inside, name),
            "Two alternatives of the same name",
            f"{quoted(name)} {names.count(name)} times",
            "each name once",
            "rename one of them",
        )
    for one in process.alternatives:
        yield from _alternative((*inside, one.name), one, process)


def _alternative(path: KeyPath, alternative: Alternative, process: Process) -> Iterator[Fault]:
    if not alternative.name.strip() or not alternative.name.isprintable():
        yield Fault(
            path,
            "A name that cannot be printed",
            quoted(alternative.name),
            "letters, digits, signs and spaces",
            "give it a name that can be read on screen",
        )
    if not (math.isfinite(alternative.prior) and alternative.prior > 0):
        yield Fault(
            (*path, "prior"),
            "A prior probability that is not above 0",
            shown(alternative.prior),
            "a number > 0, relative to the other alternatives",
            "write a number above 0, or leave out an alternative that is ruled out",
        )
    elif not is_workable(alternative.prior):
        yield from filter(None, [number_fault((*path, "prior"), alternative.prior)])
    for region in alternative.regions:
        if region in process.regions:
            yield Fault(
                (*path, "regions", region),
                "A region described twice",
                f"{quoted(region)} in the process and in an alternative",
                "the process describes a region, or all of its alternatives do",
                "leave out one of the two",
            )
    missing = [one for one in process.region_names if one not in (*alternative.regions, *process.regions)]
    if missing:
        yield Fault(
            path,
            "An alternative that leaves out a region",
            shortened(", ".join(quoted(one) for one in alternative.regions)) or "no region",
            f"a description of {shortened(', '.join(quoted(one) for one in missing))}, as the others have",
            "add it, or describe that region once in the process",
        )


def choice_faults(declared: Declared) -> Iterator[Fault]:
    """Yield the fault of more combinations of alternatives than can be weighed.

    Args:
        declared: everything declared.

    Yields:
        At most one fault.
    """
    numbers = [
        len(process.alternatives)
        for process in declared.processes.values()
        if process is not None and process.alternatives
    ]
    if math.prod(numbers) > MOST_CHOICES:
        yield Fault(
            ("processes",),
            "More combinations of alternatives than can be weighed",
            " × ".join(str(number) for number in numbers) + f" = {math.prod(numbers)}",
            f"at most {MOST_CHOICES}: each is an analysis of its own",
            "leave out alternatives, or describe fewer processes by them",
        )
