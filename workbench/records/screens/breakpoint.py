"""The screen of `breakpoint`: how wrong the backgrounds must be, compared with what is declared."""

from __future__ import annotations

import math

from workbench.evidence.breaking.results import Breaking, BreakPoint
from workbench.records.numbers import factor, fixed, ln_with_error, odds, trimmed, with_error
from workbench.records.outcomes import BreakPointOutcome
from workbench.records.screens.counted import title_lines
from workbench.records.screens.layout import (
    bullet,
    columns,
    framed,
    heading,
    named,
    one_line,
    paragraph,
    screen,
    wide_columns,
)
from workbench.records.sentences import break_point_words, threshold_text

_NAMES = ("level", "tilt", "bow")


def breakpoint_screen(outcome: BreakPointOutcome) -> str:
    """Return what `breakpoint` found as text.

    Args:
        outcome: what was found.
    """
    found = outcome.found
    lines = title_lines(outcome.analysis, outcome.origin)
    for note in outcome.origin.notes:
        lines += paragraph(note)
    lines += heading(f"Break point: {one_line(found.hypothesis)} against {one_line(found.against)}")
    if not found.ending.is_answer:
        closing = f"In short: {found.ending.value}."
        lines += framed("NOT ESTABLISHED: NO BREAK POINT IS GIVEN", [found.reason + ".", closing])
    else:
        lines += _sizes(outcome)
        lines += ["", *paragraph(break_point_words(found))]
        lines += _stated(found)
        lines += [*_terms(found), *_reading(found)] if found.distorted else []
    if outcome.analysis.cautions:
        lines += heading("Warnings")
        for caution in outcome.analysis.cautions:
            lines += bullet(caution.text)
    return screen(lines)


def _sizes(outcome: BreakPointOutcome) -> list[str]:
    found, analysis = outcome.found, outcome.analysis
    prior = analysis.hypothesis(found.hypothesis).prior / analysis.hypothesis(found.against).prior
    wanted = f"B = {factor(found.below)}, posterior odds {odds(found.below + math.log(prior))}"
    rows = [
        ["ln B as declared", ln_with_error(found.ln_bayes_factor or 0.0, found.ln_bayes_factor_error or 0.0)],
        ["threshold on ln B", f"{threshold_text(found)}  ({wanted})"],
    ]
    if found.under_peak is not None and found.rms is not None:
        under = with_error(100.0 * found.under_peak, 100.0 * (found.under_peak_error or 0.0))
        overall = with_error(100.0 * found.rms, 100.0 * (found.rms_error or 0.0))
        rows += [["break point", f"{under} % of the background under the peak"]]
        rows += [["", f"{overall} % rms over all of the background"]]
    if found.reached is not None:
        label = "ln B there" if found.ending is Breaking.FOUND else "smallest ln B"
        rows += [[label, f"{ln_with_error(found.reached, found.reached_error or 0.0)}, made afresh"]]
    return columns(rows, "ll")


def _stated(found: BreakPoint) -> list[str]:
    """Return what the declared uncertainties amount to under the peak, and the break point in units of it."""
    rows = [["background under the peak", "one sd", "break point / sd"]]
    for label, size in (
        ("before the counts", found.stated_before),
        ("after the counts", found.stated_after),
    ):
        if size is not None:
            is_comparable = found.under_peak is not None and size > 0.0
            ratio = trimmed(abs(found.under_peak or 0.0) / size, 2) if is_comparable else "–"
            rows.append([label, f"{trimmed(100.0 * size, 2)} %", ratio])
    return [*heading("What the declared uncertainties say"), *columns(rows, "lrr")]


def _terms(found: BreakPoint) -> list[str]:
    most = max(len(one.coefficients) for one in found.distorted)
    names = [*_NAMES[:most], *(f"term {place}" for place in range(len(_NAMES) + 1, most + 1))]
    rows = []
    for one in found.distorted:
        terms = [_per_cent(math.expm1(value)) for value in one.coefficients]
        terms += ["–"] * (most - len(terms))
        ends = [_per_cent(float(one.change.min())), _per_cent(float(one.change.max()))]
        rows.append([one_line(one.region), *terms, *ends])
    header = ["region", *names, "smallest", "largest"]
    return [*heading("The distortion, in per cent of the background"), *wide_columns(header, rows)]


def _per_cent(size: float) -> str:
    text = fixed(100.0 * size, 1)
    return text if text.startswith("−") else f"+{text}"


def _reading(found: BreakPoint) -> list[str]:
    lines = heading("How to read it")
    lines += bullet(
        "The backgrounds are held at the distortion under both hypotheses, while everything that is declared "
        "keeps its uncertainty: what those uncertainties can absorb does not count. Whether a mistake of "
        "this size and shape is likely is for those who made the backgrounds to say."
    )
    if found.ending is Breaking.FOUND:
        lines += bullet(
            f"To weigh such a mistake instead, give a hypothesis a distortion (see {named('neither')} in the "
            "README). More terms bend more finely and need less."
        )
    return lines
