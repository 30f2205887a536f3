"""What a reader of a prior's examination should know."""

from __future__ import annotations

from collections.abc import Iterator

from workbench.errors import Caution, quoted
from workbench.evidence.prior_choice.case import Case, strengths_of
from workbench.evidence.prior_choice.curve import StrengthCurve
from workbench.evidence.prior_choice.local_p import LocalP


def examination_cautions(case: Case, curve: StrengthCurve, local: LocalP | None) -> Iterator[Caution]:
    """Yield what this case gives reason to say.

    Args:
        case: the hypotheses and the strength.
        curve: ln R of the strength.
        local: the local p-value, where there is one.
    """
    name = case.comparison.hypothesis
    others = [one for one in strengths_of(case.analysis, name) if one != case.strength]
    if others:
        names = " and ".join(quoted(one) for one in others)
        yield Caution(
            "other-strengths",
            f"Only the prior of {quoted(case.strength)} is varied; {names} keeps its prior, which all "
            "numbers are averaged over.",
        )
    searched = [
        one
        for one in case.analysis.signal_parameters(name)
        if one not in {case.strength, *others} and one not in case.analysis.hypothesis(name).fix
    ]
    if searched:
        names = " and ".join(quoted(one) for one in searched)
        yield Caution(
            "averaged",
            f"Every number here is averaged over the stated prior of {names}; a narrower or wider one "
            "moves all of them.",
        )
    if case.alternative:
        yield Caution(
            "one-alternative",
            f"Nuisance priors are raised to powers with {quoted(case.alternative)}, the likeliest "
            "alternative of the backgrounds; every other number is an average over the alternatives.",
        )
    if not curve.is_ended:
        yield Caution(
            "unbounded-strength",
            f"The counts do not exclude any {quoted(case.strength)}: what priors hold beyond "
            f"{curve.reach:.3g} is taken to be as probable as there.",
        )
    if local is None:
        yield Caution(
            "no-local-p",
            f"No local p-value: {quoted(name)} is not {quoted(case.comparison.against)} with this signal "
            "added, or a fit gave nothing to use.",
        )
    elif searched:
        yield Caution(
            "local-p",
            "The bound from the p-value takes the place of the signal as known: p is local, at the best fit. "
            "Where the place was searched for, it allows more than it should.",
        )
