"""Which hypothesis is scanned over which parameters, and what cannot be."""

from __future__ import annotations

from collections.abc import Sequence

from workbench.errors import InputError, Problem, nearest, quoted
from workbench.hypotheses.alternatives import in_doubt
from workbench.hypotheses.analysis import Analysis

OVER = "scan over"


def chosen_hypothesis(analysis: Analysis, over: Sequence[str] | None, asked: str | None) -> str:
    """Return the hypothesis to scan: the one asked for, or the first beyond background only that can be.

    Args:
        analysis: everything declared.
        over: parameters to scan over; None for all.
        asked: a hypothesis' name; None to choose.

    Raises:
        InputError: if there is none, or the signal has alternatives.
    """
    doubted = [process for process in in_doubt(analysis) if process.is_signal]
    if doubted:
        raise InputError(
            Problem(
                "A signal with alternatives is not scanned",
                "scan",
                " and ".join(quoted(process.name) for process in doubted),
                "one description of the signal",
                "scan once for each alternative, keeping one in the file at a time",
            )
        )
    names = [one.name for one in analysis.hypotheses]
    if asked is not None:
        if asked not in names[1:]:
            raise InputError(_stranger(asked, names))
        return asked
    able = [name for name in names[1:] if analysis.signal_parameters(name)]
    if not able:
        raise InputError(
            Problem(
                "There is nothing to scan over",
                "the analysis' hypotheses",
                "no hypothesis with a free signal parameter beside the first",
                "a parameter that only signal processes use",
                "give a strength or a mass a prior, and do not hold it with fix",
            )
        )
    wanted = set(over or ())
    whole = [name for name in able if wanted <= set(analysis.signal_parameters(name))]
    return (whole or able)[0]


def refuse_strangers(analysis: Analysis, hypothesis: str, over: Sequence[str] | None) -> tuple[str, ...]:
    """Return the parameters to scan over, or refuse those that are no free signal parameters.

    Args:
        analysis: everything declared.
        hypothesis: the hypothesis to scan.
        over: names; None for all of its signal parameters.

    Raises:
        InputError: for every name that is none, or given twice.
    """
    known = analysis.signal_parameters(hypothesis)
    names = tuple(known if over is None else over)
    problems = [_not_scanned(analysis, hypothesis, name, known) for name in names if name not in known]
    twice = sorted({name for name in names if names.count(name) > 1})
    problems += [
        Problem("A parameter named twice", OVER, quoted(name), "each parameter once", "name it once")
        for name in twice
    ]
    if not names:
        problems.append(
            Problem(
                "A hypothesis without a free signal parameter",
                OVER,
                quoted(hypothesis),
                "a parameter that only signal processes use, with a prior",
                "scan another hypothesis",
            )
        )
    if problems:
        raise InputError(*problems)
    return names


def _not_scanned(analysis: Analysis, hypothesis: str, name: str, known: tuple[str, ...]) -> Problem:
    listed = " or ".join(quoted(one) for one in known) or "nothing: it has no free signal parameter"
    expected = f"a free signal parameter of {quoted(hypothesis)}: {listed}"
    held = analysis.held_parameters(hypothesis)
    if name in held:
        found = f"{quoted(name)}, held at {held[name]:g} there"
        return Problem(
            "A parameter that is held", OVER, found, expected, "scan a hypothesis that leaves it free"
        )
    if name in {one.name for one in analysis.parameters} | set(analysis.sources_used(hypothesis)):
        found = f"{quoted(name)}, which does not belong to the signal alone"
        return Problem("A parameter that is no signal parameter", OVER, found, expected, f"name {listed}")
    return Problem("A parameter that is not known", OVER, quoted(name), expected, nearest(name, known))


def _stranger(asked: str, names: list[str]) -> Problem:
    if asked in names[:1]:
        return Problem(
            "The hypothesis that others are compared with",
            "scan",
            quoted(asked),
            "a hypothesis with a signal",
            "name one of: " + ", ".join(names[1:]),
        )
    return Problem(
        "No such hypothesis",
        "scan",
        quoted(asked),
        "one of: " + ", ".join(names[1:]),
        nearest(asked, names[1:]),
    )
