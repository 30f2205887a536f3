"""The screen of `scan`: the updating ratio along a parameter, where it peaks, and what it rests on."""

from __future__ import annotations

import math
from collections.abc import Mapping

import numpy as np

from workbench.evidence.ratio.reading import profile, shown_values
from workbench.evidence.ratio.results import Scan
from workbench.records.numbers import factor, fixed, ln_with_error, significant, trimmed, with_errors
from workbench.records.outcomes import ScanOutcome
from workbench.records.screens.bars import bars
from workbench.records.screens.counted import NONE, counted_lines, title_lines
from workbench.records.screens.layout import (
    aligned_at,
    bullet,
    columns,
    framed,
    heading,
    named,
    one_line,
    paragraph,
    screen,
)
from workbench.records.sentences import scan_cautions

ROWS = 25


def scan_screen(outcome: ScanOutcome) -> str:
    """Return what `scan` found as text.

    Args:
        outcome: what was found.
    """
    found = outcome.found
    lines = title_lines(outcome.analysis, outcome.origin)
    for note in outcome.origin.notes:
        lines += paragraph(note)
    lines += counted_lines(outcome.analysis)
    names = f"{one_line(found.hypothesis)} against {one_line(found.against)}"
    lines += heading(f"Updating ratio R: {names}")
    if not found.established:
        lines += framed("NOT ESTABLISHED", [found.reason.removesuffix(".") + "."])
    if found.surface is not None:
        lines += profile_lines(found)
        lines += reading_lines(found) if found.established else []
        lines += prior_lines(found)
        lines += support_lines(found)
    lines += heading("Cautions")
    for caution in scan_cautions(found):
        lines += bullet(caution.text)
    if outcome.analysis.cautions:
        lines += heading("Warnings")
        for caution in outcome.analysis.cautions:
            lines += bullet(caution.text)
    return screen(lines)


def profile_lines(found: Scan) -> list[str]:
    """Return ln R along the main parameter with a bar each; other parameters where R is largest."""
    read = profile(found, shown_values(found, ROWS))
    peak = int(np.argmax(read.ln_ratio))
    marks = ["peak" if place == peak else "" for place in range(read.values.size)]
    header = [_with_unit(read.parameter, found.units)]
    header += [f"{one_line(name)} there" for name in read.others]
    drawn = bars(read.ln_ratio)
    rows = [[*header, "ln R", "R", drawn.header, ""]]
    texts = aligned_at(" ±", with_errors(read.ln_ratio.tolist(), read.error.tolist()))

    steps = np.diff(read.values).max()
    for place, value in enumerate(read.values):
        others = [significant(float(values[place])) for values in read.others.values()]
        ratio = factor(float(read.ln_ratio[place]), 0.0)
        rows.append([_place(value, steps), *others, texts[place], ratio, drawn.rows[place], marks[place]])
    sides = "r" * (len(rows[0]) - 2) + "ll"
    lines = columns(rows, sides)
    if read.others:
        rest = " and ".join(named(name) for name in read.others)
        lines += ["", *paragraph(f"At each {one_line(read.parameter)}, {rest} is where R is largest.")]
    return lines


def reading_lines(found: Scan) -> list[str]:
    """Return where R peaks, and R there."""
    values, ln_ratio, error = found.peak
    rows = [
        ["R is largest at", ", ".join(_value(name, value, found.units) for name, value in values.items())]
    ]
    rows.append(["ln R there", ln_with_error(ln_ratio, error)])
    rows.append(["R there", factor(ln_ratio, error)])
    if found.is_nested and _strengths_kept(found):
        rows.append(["R at strength 0", "1 (exact)"])
    return [*heading("Where R peaks"), *columns(rows, "ll")]


def prior_lines(found: Scan) -> list[str]:
    """Return the priors that are no part of R, and those that are."""
    rows = [["signal parameter", "known from", "to", "stated prior", ""]]
    for name, prior in found.priors.items():
        low, high = found.known.ranges[name]
        rows.append(
            [_with_unit(name, found.units), trimmed(low, 5), trimmed(high, 5), prior.text(), "no part of R"]
        )
    for name, prior in found.averaged.items():
        rows.append([_with_unit(name, found.units), NONE, NONE, prior.text(), "R is averaged over it"])
    average = found.reprior()
    lines = [*heading("Priors"), *columns(rows, "lrrll")]
    pair = [
        ["under the stated priors", "ln B"],
        ["average of R", ln_with_error(average.ln_bayes_factor, average.error)],
    ]
    if found.ln_bayes_factor is not None:
        pair.append(
            ["as weigh has it", ln_with_error(found.ln_bayes_factor, found.ln_bayes_factor_error or 0.0)]
        )
    return [*lines, "", *columns(pair, "ll")]


def support_lines(found: Scan) -> list[str]:
    """Return how many nodes there are, and what direct evaluations between them say."""
    nodes = found.known.ln_ratio.size
    rows = [["nodes", f"{nodes:,}"]]
    if found.draws:
        rows.append(["draws at each", f"{found.draws:,}"])
    if found.checks:
        gaps = [abs(check.ln_ratio - check.direct) for check in found.checks]
        pulls = [abs(check.pull) for check in found.checks]
        words = f"{len(gaps)}, off by {significant(max(gaps), 2)} at most, {fixed(max(pulls), 1)} errors"
        rows.append(["direct evaluations between them", words])
    return [*heading("What R rests on"), *columns(rows, "ll")]


def _strengths_kept(found: Scan) -> bool:
    return found.known.strengths is not None and not any(
        one.name not in found.over for one in found.known.panels
    )


def _with_unit(name: str, units: Mapping[str, str]) -> str:
    unit = units.get(name, "")
    return f"{one_line(name)} [{one_line(unit)}]" if unit else one_line(name)


def _value(name: str, value: float, units: Mapping[str, str]) -> str:
    unit = units.get(name, "")
    return f"{one_line(name)} {significant(value, 4)}{' ' + one_line(unit) if unit else ''}"


def _place(value: float, step: float) -> str:
    """Return a value with as many decimals as its neighbours need to differ."""
    return fixed(value, max(1 - math.floor(math.log10(step)), 0)) if step > 0.0 else significant(value)
