"""The parts of a screen that say what was counted, what is claimed, and whether either fits."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from workbench.counts.region import Region
from workbench.ensembles.results import Adequacy
from workbench.hypotheses.analysis import Analysis
from workbench.likelihood.results import Ending, Fit
from workbench.records.descriptions import exposure_words
from workbench.records.numbers import as_written, count, fixed
from workbench.records.outcomes import Origin
from workbench.records.screens.layout import (
    INDENT,
    bullet,
    columns,
    framed,
    heading,
    named,
    one_line,
    paragraph,
    wide_columns,
)
from workbench.records.sentences import adequacy_number, adequacy_verdict, prior_words, verdict_on_all

NONE = "–"
ALL_FAIL = (
    "Odds between descriptions that all fail say which fails less, not which is true. "
    "Find what is missing before reading on."
)
ONE_FAILS = (
    "Odds against a hypothesis that fails by itself say that it is a poor description. "
    "That is not yet a reason to believe another."
)


def title_lines(analysis: Analysis, origin: Origin) -> list[str]:
    """Return the title and, under it, the file, the exposure and the seed."""
    parts = [origin.file] if origin.file else []
    if analysis.exposure is not None:
        parts.append(f"exposure {exposure_words(analysis.exposure)}")
    if origin.seed is not None:
        parts.append(f"seed {origin.seed}")
    lines = paragraph(analysis.title or "Untitled analysis", "")
    return [*lines, *paragraph(" · ".join(parts), "")]


def counted_lines(analysis: Analysis) -> list[str]:
    """Return one line a region: what its axis is, its bins, and its observed events."""
    rows = [["region", "observable", "bins", "empty", "observed"]]
    for region in analysis.regions:
        observed = region.table.observed
        seen = [NONE, NONE] if observed is None else [count(np.sum(observed == 0)), count(np.sum(observed))]
        rows.append([one_line(region.name), axis_label(region), count(region.table.binning.number), *seen])
    return [*heading("What was counted"), *columns(rows, "llrrr")]


def axis_label(region: Region) -> str:
    """Return what a region's axis measures, with its unit in brackets."""
    name = one_line(region.observable) or "not named"
    return f"{name} [{one_line(region.unit)}]" if region.unit else name


def claimed_lines(analysis: Analysis, fits: Sequence[Fit]) -> list[str]:
    """Return each region's expected events by process and hypothesis, and the signal's priors."""
    lines = heading("What is claimed: events expected at each hypothesis' best fit")
    start = 0
    for place, region in enumerate(analysis.regions):
        bins = slice(start, start + region.table.binning.number)
        start = bins.stop
        lines += ([""] if place else []) + _events_table(analysis, region, fits, bins)
    for fit in fits:
        if fit.others:
            lines += bullet(f"Fit of {named(fit.hypothesis)}: with {named(fit.alternative)}, {best_of(fit)}.")
        if fit.ending is not Ending.CONVERGED:
            lines += bullet(f"Fit of {named(fit.hypothesis)}: {fit.ending.value}.")
    return lines + _signal_priors(analysis)


def best_of(fit: Fit) -> str:
    """Return among how many alternatives a fit is the best, in words."""
    return f"the best of {len(fit.others) + 1} alternatives"


def adequacy_lines(adequacies: Sequence[Adequacy]) -> list[str]:
    """Return one line a hypothesis: does it describe the data at all."""
    rows = [[one_line(item.hypothesis), adequacy_number(item), adequacy_verdict(item)] for item in adequacies]
    lines = [*heading("Do the hypotheses describe the data?"), *columns(rows, "lll")]
    judged = [
        f"{named(one.alternative)} under {named(one.hypothesis)}" for one in adequacies if one.alternative
    ]
    if judged:
        lines += bullet(f"Judged with the likeliest alternative: {', '.join(judged)}.")
    for item in adequacies:
        if item.unfinished_fits:
            lines += bullet(
                f"{named(item.hypothesis)}: {item.unfinished_fits:,} of these fits did not converge."
            )
    return lines


def loud_lines(adequacies: Sequence[Adequacy]) -> list[str]:
    """Return the frame for hypotheses that do not describe the data; nothing when all do."""
    failing = [one_line(item.hypothesis) for item in adequacies if item.fails]
    if not failing:
        return []
    verdict = verdict_on_all(adequacies)
    numbers = "; ".join(f"{one_line(item.hypothesis)}: {adequacy_number(item)}" for item in adequacies)
    if verdict:
        return framed(
            verdict.upper(),
            [
                f"{numbers}.",
                ALL_FAIL,
            ],
        )
    return framed(
        f"{' and '.join(failing)}: DOES NOT DESCRIBE THE DATA",
        [
            f"{numbers}.",
            ONE_FAILS,
        ],
    )


def _events_table(analysis: Analysis, region: Region, fits: Sequence[Fit], bins: slice) -> list[str]:
    names = [process.name for process in analysis.processes if region.name in process.region_names]
    sums = {
        name: [float(fit.by_process[name][bins].sum()) if name in fit.by_process else None for fit in fits]
        for name in names
    }
    totals = [float(fit.expected[bins].sum()) for fit in fits]
    decimals = event_decimals([value for row in sums.values() for value in row if value is not None])
    header = [one_line(region.name), *(one_line(fit.hypothesis) for fit in fits)]
    rows = [
        [one_line(name), *(NONE if value is None else fixed(value, decimals) for value in sums[name])]
        for name in names
    ]
    rows.append(["total", *(fixed(value, decimals) for value in totals)])
    if region.table.observed is not None:
        pad = " " * (decimals + 1 if decimals else 0)
        rows.append(["observed", *[count(region.table.observed.sum()) + pad] * len(fits)])
    return wide_columns(header, rows)


def event_decimals(values: Sequence[float]) -> int:
    """Return the decimals with which the smallest of some event numbers still shows two digits; 1 to 4."""
    smallest = min((value for value in values if value > 0.0), default=1.0)
    return int(np.clip(1 - np.floor(np.log10(smallest)), 1, 4))


def _signal_priors(analysis: Analysis) -> list[str]:
    rows: list[list[str]] = []
    signals = {name for item in analysis.hypotheses for name in analysis.signal_parameters(item.name)}
    for parameter in analysis.parameters:
        words = [prior_words(parameter)] if parameter.name in signals else []
        words += [
            f"held at {as_written(item.fix[parameter.name])} under {one_line(item.name)}"
            for item in analysis.hypotheses
            if parameter.name in item.fix
        ]
        if words:
            rows.append([one_line(parameter.name), "; ".join(words)])
    if not rows:
        return []
    return ["", *columns([["signal parameter", "prior"], *rows], "ll", INDENT)]
