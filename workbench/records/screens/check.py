"""The screen of `check`: what was understood, what the priors predict, and whether anything fits; no odds."""

from __future__ import annotations

import numpy as np

from workbench.counts.region import Region
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.exposure import EXPOSURE_SOURCE
from workbench.hypotheses.parameters import Parameter
from workbench.hypotheses.processes import Description, Process
from workbench.records.descriptions import (
    alternative_priors,
    column_uses,
    distortion_words,
    percent,
    shape_words,
    source_words,
    yield_words,
)
from workbench.records.numbers import as_written, count, fixed, probability
from workbench.records.outcomes import CheckOutcome
from workbench.records.screens.counted import (
    adequacy_lines,
    axis_label,
    event_decimals,
    loud_lines,
    title_lines,
)
from workbench.records.screens.layout import INDENT, bullet, columns, heading, one_line, paragraph, screen
from workbench.records.sentences import verdict_on_all


def check_screen(outcome: CheckOutcome) -> str:
    """Return what `check` found as text.

    Args:
        outcome: what was found.
    """
    analysis, adequacies = outcome.analysis, outcome.adequacies
    title, loud = title_lines(analysis, outcome.origin), loud_lines(adequacies)
    lines = [*loud, "", *title] if verdict_on_all(adequacies) else [*title, *([""] if loud else []), *loud]
    for note in outcome.origin.notes:
        lines += paragraph(note)
    for region in analysis.regions:
        lines += region_lines(analysis, region)
    lines += process_lines(analysis)
    lines += parameter_lines(analysis)
    lines += uncertainty_lines(analysis)
    lines += hypothesis_lines(analysis)
    lines += predictive_lines(outcome)
    if adequacies:
        lines += adequacy_lines(adequacies)
    else:
        lines += heading("Do the hypotheses describe the data?")
        lines += paragraph("Nothing was observed yet, so there is nothing to judge.")
    if analysis.cautions:
        lines += heading("Warnings")
        for caution in analysis.cautions:
            lines += bullet(caution.text)
    return screen(lines)


def region_lines(analysis: Analysis, region: Region) -> list[str]:
    """Return a region's bins, counts and template columns with who uses them."""
    binning, observed = region.table.binning, region.table.observed
    unit = f" {one_line(region.unit)}" if region.unit else ""
    ends = f"from {as_written(binning.first)} to {as_written(binning.last)}{unit}"
    rows = [
        ["observable", axis_label(region)],
        ["bins", f"{binning.number:,} {ends}, {_widths(region)}"],
        ["table", one_line(region.table.source)],
    ]
    if observed is None:
        rows.append(["observed", "nothing yet"])
    else:
        empty, single = count(np.sum(observed == 0)), count(np.sum(observed == 1))
        total = f"{count(observed.sum())} events"
        rows.append(["observed", f"{total}; bins empty: {empty}, with a single count: {single}"])
    if region.table.errors:
        taken = "enter the likelihood" if region.template_errors else "are NOT used (template_errors = false)"
        rows.append(["template errors", f"of {', '.join(region.table.errors)} {taken}"])
    if region.empty_bin_events is not None:
        given = as_written(region.empty_bin_events)
        rows.append(["unfilled bins", f"bins that no background fills get {given} events"])
    lines = [*heading(f"Region {one_line(region.name)}"), *columns(rows, "ll")]
    uses = column_uses(analysis, region.name)
    if uses:
        sums = {name: float(values.sum()) for name, values in region.table.columns.items()}
        decimals = event_decimals(list(sums.values()))
        body = [
            [one_line(name), fixed(sums[name], decimals), ", ".join(users) or "nobody"]
            for name, users in uses.items()
            if name in sums
        ]
        lines += ["", *columns([["template column", "sum", "used by"], *body], "lrl")]
    return lines


def process_lines(analysis: Analysis) -> list[str]:
    """Return every process' expected events and shape, by region."""
    rows = [["process", "kind", "region", "events × shape"]]
    for process in analysis.processes:
        for place, description in enumerate(process.descriptions):
            first = [one_line(process.name), process.kind] if place == 0 else ["", ""]
            rows.append([*first, one_line(description.region), _description_words(process, description)])
    return [*heading("Processes"), *columns(rows, "llll"), *_alternative_lines(analysis)]


def _description_words(process: Process, description: Description) -> str:
    contribution = description.contribution
    fixed_yield = "" if process.follows_exposure else "; does not follow exposure"
    under = f"{one_line(description.alternative)}: " if description.alternative else ""
    return f"{under}{yield_words(process, contribution)} × {shape_words(contribution.shape)}{fixed_yield}"


def _alternative_lines(analysis: Analysis) -> list[str]:
    """Return the prior probability of each alternative of the processes that have some."""
    rows = [["process in doubt", "alternative", "prior"]]
    for process in analysis.processes:
        for place, (name, share) in enumerate(alternative_priors(process).items()):
            first = one_line(process.name) if place == 0 else ""
            rows.append([first, one_line(name), probability(share, 1.0 - share)])
    return ["", *columns(rows, "llr")] if len(rows) > 1 else []


def parameter_lines(analysis: Analysis) -> list[str]:
    """Return every parameter with its prior in words and its role."""
    if not analysis.parameters:
        return []
    rows = [["parameter", "prior", "role"]]
    rows += [[_name(item), item.prior.text(), _role(analysis, item)] for item in analysis.parameters]
    return [*heading("Parameters"), *columns(rows, "lll")]


def uncertainty_lines(analysis: Analysis) -> list[str]:
    """Return every source of uncertainty and what it does to each process."""
    rows: list[list[str]] = []
    for source in analysis.uncertainties:
        for place, (process, words) in enumerate(source_words(source)):
            rows.append([one_line(source.name) if place == 0 else "", one_line(process), words])
    exposure = analysis.exposure
    if exposure is not None and exposure.uncertainty is not None:
        rows.append([EXPOSURE_SOURCE, "all that follow exposure", percent(exposure.uncertainty)])
    if not rows:
        return [*heading("Uncertainties"), *paragraph("None is declared.")]
    header = ["uncertainty", "acts on", "one standard deviation"]
    return [*heading("Uncertainties"), *columns([header, *rows], "lll")]


def hypothesis_lines(analysis: Analysis) -> list[str]:
    """Return every hypothesis with its prior probability and processes."""
    total = sum(item.prior for item in analysis.hypotheses)
    rows = [["hypothesis", "prior", "processes"]]
    for item in analysis.hypotheses:
        held = "".join(f"; {name} held at {as_written(value)}" for name, value in item.fix.items())
        distorted = distortion_words(analysis, item.name)
        held += f"; {distorted}" if distorted else ""
        share = item.prior / total
        rows.append([one_line(item.name), probability(share, 1.0 - share), ", ".join(item.processes) + held])
    return [*heading("Hypotheses"), *columns(rows, "lrl")]


def predictive_lines(outcome: CheckOutcome) -> list[str]:
    """Return the total count that the priors alone predict, against what was observed."""
    observed = [region.table.observed for region in outcome.analysis.regions]
    known = [counts for counts in observed if counts is not None]
    seen = (
        f" (observed: {count(sum(counts.sum() for counts in known))})" if len(known) == len(observed) else ""
    )
    rows = [["hypothesis", "median", "68 % of the draws"]]
    for item in outcome.predictives:
        low, median, high = (count(value) for value in (item.total_low, item.total_median, item.total_high))
        rows.append([one_line(item.hypothesis), median, f"{low} to {high}"])
    title = f"Counts in all as the priors predict them{seen}"
    return [*heading(title), *columns(rows, "lrr", INDENT)]


def _widths(region: Region) -> str:
    widths = region.table.binning.high - region.table.binning.low
    unit = f" {one_line(region.unit)}" if region.unit else ""
    narrow, wide = float(widths.min()), float(widths.max())
    if wide - narrow <= 1e-9 * wide:
        return f"each {as_written(float(f'{narrow:.6g}'))}{unit} wide"
    return f"{as_written(float(f'{narrow:.6g}'))} to {as_written(float(f'{wide:.6g}'))}{unit} wide"


def _name(item: Parameter) -> str:
    return one_line(f"{item.name} [{item.unit}]" if item.unit else item.name)


def _role(analysis: Analysis, item: Parameter) -> str:
    signal = any(item.name in analysis.signal_parameters(user.name) for user in analysis.hypotheses)
    if signal:
        return "signal"
    used = any(item.name in analysis.parameters_used(user.name) for user in analysis.hypotheses)
    return "nuisance" if used else "held or unused"
