"""An analysis whose backgrounds have alternatives, as the analyses that it is an average of.

One description of a process holds, in all its regions at once, and none is known to be the one. A hypothesis
then stands for every combination of alternatives of its processes, each with its prior probability; its
evidence is their average. A variant is the analysis with one combination in force: it has no alternatives.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

from workbench.hypotheses.frozen import FrozenMapping
from workbench.hypotheses.hypothesis import Hypothesis
from workbench.hypotheses.processes import Alternative, Process

if TYPE_CHECKING:  # only for annotations: an analysis knows nothing of its variants
    from workbench.hypotheses.analysis import Analysis


@dataclass(frozen=True, slots=True, eq=False)
class Variant:
    """An analysis with one alternative of each process in force.

    Attributes:
        choice: process name to the alternative in force, for every process in doubt.
        prior: prior probability of the choice; those of all variants add up to 1.
        analysis: the analysis with that choice and without alternatives.
    """

    choice: Mapping[str, str]
    prior: float
    analysis: Analysis

    @property
    def name(self) -> str:
        """Return the choice in words: the alternative's name, with its process where several are in doubt."""
        return choice_words(self.choice)


def choice_words(choice: Mapping[str, str]) -> str:
    """Return a choice of alternatives in words; empty where there is none.

    Args:
        choice: process name to the alternative in force.
    """
    if len(choice) == 1:
        return next(iter(choice.values()))
    return ", ".join(f"{process}: {alternative}" for process, alternative in choice.items())


def in_doubt(analysis: Analysis, hypothesis: str | None = None) -> tuple[Process, ...]:
    """Return the processes of a hypothesis, or of any, that have alternatives.

    Args:
        analysis: everything declared.
        hypothesis: the hypothesis' name; None for the processes that any hypothesis uses.

    Returns:
        Processes in declaration order.

    Raises:
        InputError: if there is no such hypothesis.
    """
    names = [one.name for one in analysis.hypotheses] if hypothesis is None else [hypothesis]
    used = {process.name for name in names for process in analysis.processes_of(name)}
    return tuple(one for one in analysis.processes if one.alternatives and one.name in used)


def variants_of(analysis: Analysis, hypothesis: str | None = None) -> tuple[Variant, ...]:
    """Return the analyses that an analysis with alternatives stands for.

        P(choice) = product over processes of (the alternative's prior/the sum over the process' alternatives)

    A hypothesis' held parameters stay held where the alternatives in force use them. Processes that are not
    in doubt, or not part of the hypothesis, stay as they are.

    Args:
        analysis: everything declared.
        hypothesis: the hypothesis whose processes are chosen for; None for those of every hypothesis.

    Returns:
        One variant a combination, the first process' alternatives slowest; without alternatives the analysis
        itself, with an empty choice.

    Raises:
        InputError: if there is no such hypothesis.

    Source:
        none, definition
    """
    doubted = in_doubt(analysis, hypothesis)
    if not doubted:
        return (Variant(FrozenMapping({}), 1.0, analysis),)
    made = []
    for chosen in itertools.product(*(process.alternatives for process in doubted)):
        shares = [
            one.prior / math.fsum(other.prior for other in process.alternatives)
            for one, process in zip(chosen, doubted, strict=True)
        ]
        choice = {process.name: one.name for process, one in zip(doubted, chosen, strict=True)}
        made.append(Variant(FrozenMapping(choice), math.prod(shares), with_choice(analysis, choice)))
    return tuple(made)


def with_choice(analysis: Analysis, choice: Mapping[str, str]) -> Analysis:
    """Return the analysis with some processes' alternatives chosen, and without what then is not used.

    Args:
        analysis: everything declared.
        choice: process name to alternative; processes left out keep their alternatives.

    Returns:
        The analysis; it holds no parameter that its hypotheses do not use.

    Source:
        none, definition
    """
    processes = tuple(
        _chosen(process, next(one for one in process.alternatives if one.name == choice[process.name]))
        if process.name in choice
        else process
        for process in analysis.processes
    )
    hypotheses = tuple(_holding_what_it_uses(one, processes) for one in analysis.hypotheses)
    return replace(analysis, processes=processes, hypotheses=hypotheses)


def _chosen(process: Process, alternative: Alternative) -> Process:
    return replace(process, regions={**process.regions, **alternative.regions}, alternatives=())


def _holding_what_it_uses(hypothesis: Hypothesis, processes: Iterable[Process]) -> Hypothesis:
    used = {
        name for process in processes if process.name in hypothesis.processes for name in process.parameters
    }
    return replace(hypothesis, fix={name: at for name, at in hypothesis.fix.items() if name in used})
