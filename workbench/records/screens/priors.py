"""The screen of `priors`: how much of a Bayes factor was put in by hand, as an argument for a review."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence

import numpy as np

from workbench.evidence.prior_choice.averages import Average
from workbench.evidence.prior_choice.bounds import Bound
from workbench.evidence.prior_choice.curve import LEAST_TOLD
from workbench.evidence.prior_choice.results import PriorSensitivity
from workbench.evidence.prior_choice.sensitivity import SCALES, STEPS
from workbench.evidence.prior_choice.verdicts import Range, ranges
from workbench.records.numbers import as_written, factor, fixed, ln_with_error, significant, trimmed
from workbench.records.outcomes import PriorsOutcome
from workbench.records.screens.counted import adequacy_lines, loud_lines, title_lines
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
    wide_columns,
)
from workbench.records.screens.powers import power_lines
from workbench.records.sentences import usual_cautions, verdict_on_all

_MOST_MEANS = 8
_CLASSES = {
    "any prior": "any",
    "peak at the prediction": "with a single peak at 1",
    "never rising": "never rising away from 0",
}


def priors_screen(outcome: PriorsOutcome) -> str:
    """Return what `priors` found as text; adequacy stands first.

    Args:
        outcome: what was found.
    """
    found, adequacies = outcome.found, outcome.adequacies
    title, loud = title_lines(outcome.analysis, outcome.origin), loud_lines(adequacies)
    lines = [*loud, "", *title] if verdict_on_all(adequacies) else [*title, *([""] if loud else []), *loud]
    for note in outcome.origin.notes:
        lines += paragraph(note)
    lines += adequacy_lines(adequacies)
    lines += declared_lines(found)
    if found.established:
        lines += bound_lines(found)
        lines += family_lines(found)
        lines += boundary_lines(found)
        lines += needed_lines(found)
        lines += power_lines(found.scalings)
    lines += heading("Cautions")
    for caution in usual_cautions(outcome.analysis, [found.comparison]):
        lines += bullet(caution.text)
    if outcome.cautions:
        lines += heading("Warnings")
        for caution in outcome.cautions:
            lines += bullet(caution.text)
    return screen(lines)


def declared_lines(found: PriorSensitivity) -> list[str]:
    """Return what is examined, and ln B under the priors as they are declared."""
    comparison, declared = found.comparison, found.declared
    names = f"{one_line(comparison.hypothesis)} against {one_line(comparison.against)}"
    lines = heading(f"The prior of {named(found.strength)}: {names}")
    value, error = comparison.ln_bayes_factor, comparison.ln_bayes_factor_error or 0.0
    mean = f"{trimmed(declared.mean)}, which is {_events(declared.mean * found.events)}"
    rows = [["declared", declared.text], ["its mean", mean]]
    if not found.established or value is None:
        reason = found.reason.removesuffix(".") + "."
        return [
            *lines,
            *columns(rows, "ll"),
            "",
            *framed("NOT ESTABLISHED: NOTHING IS SAID ABOUT PRIORS", [reason]),
        ]
    rows += [["ln B", ln_with_error(value, error)], ["Bayes factor B", factor(value, error)]]
    return [*lines, *columns(rows, "ll")]


def bound_lines(found: PriorSensitivity) -> list[str]:
    """Return the largest ln B of each class of priors, and what the p-value allows."""
    lines = heading(f"The most that any choice of the prior of {named(found.strength)} makes of these counts")
    known = [one for one in found.bounds if one.name in _CLASSES]
    values = aligned_at(" ±", [ln_with_error(one.ln_bayes_factor, one.error) for one in known])
    factors = aligned_at(" ±", [factor(one.ln_bayes_factor, one.error) for one in known])
    rows = [["priors", "largest ln B", "B", "reached by"]]
    rows += [
        [_CLASSES[one.name], value, size, _reached(one)]
        for one, value, size in zip(known, values, factors, strict=True)
    ]
    lines += columns(rows, "llll")
    for bound in found.bounds:
        if bound.name == "p-value" and found.local is not None:
            p, q0 = factor(found.local.ln_p), fixed(found.local.statistic, 1)
            size = f"{fixed(bound.ln_bayes_factor, 2)} (B {factor(bound.ln_bayes_factor)})"
            lines += bullet(
                f"−e p ln p: the local p-value of {p} (asymptotic, q0 = {q0}) allows ln B up to {size}."
            )
    lines += bullet("What reaches a bound was read off these counts: nobody could have stated it before.")
    return lines


def family_lines(found: PriorSensitivity) -> list[str]:
    """Return ln B by family and mean, as many means as there is room for."""
    places = shown_places(found)
    means = found.means[places]
    header = ["mean of the prior", *(_marked(trimmed(float(mean)), mean, found) for mean in means)]
    rows = [["in events", *(_plain(float(mean) * found.events) + " " for mean in means)], [""] * len(header)]
    rows += [
        [family.name, *(_told(family.averages[place]) + " " for place in places)] for family in found.families
    ]
    errors = [one.error for family in found.families for one in family.averages if one.error is not None]
    largest = significant(max(errors, default=0.0), 1)
    lines = [*heading("ln B by the prior's family and mean"), *wide_columns(header, rows)]
    lines += bullet(f"* as declared. Numerical errors are at most {largest}.")
    words = "; ".join(f"{one.name}: {one.words}" for one in found.families if one.words)
    return lines + bullet(f"{words[0].upper()}{words[1:]}.")


def shown_places(found: PriorSensitivity) -> list[int]:
    """Return places of means a factor of 2, 4, 8... apart, the declared one among them."""
    declared = int(np.argmin(np.abs(np.log(found.means / found.declared.mean))))
    step = STEPS
    while True:
        places = [place for place in range(found.means.size) if (place - declared) % step == 0]
        if len(places) <= _MOST_MEANS:
            return places
        step *= 2


def boundary_lines(found: PriorSensitivity) -> list[str]:
    """Return for which means ln B has passed the boundaries of the first published scale."""
    scale = SCALES[0]
    passed = found.crossings[scale.name]
    boundaries = [b for b in _both_signs(scale.boundaries) if _is_passed(found, b)]
    title = f"Means for which ln B is beyond the boundaries of {scale.name}"
    if not boundaries:
        return [*heading(title), *paragraph("None is passed by any of these priors.")]
    header = ["family", *(f"ln B {'≥' if b > 0 else '≤'} {as_written(round(b, 3))}" for b in boundaries)]
    rows = [
        [family.name, *(_range_words(ranges(family, b, passed)) for b in boundaries)]
        for family in found.families
    ]
    lines = [*heading(title), *wide_columns(header, rows)]
    examined = f"{trimmed(float(found.means[0]))} to {trimmed(float(found.means[-1]))}"
    return lines + bullet(f"Of means from {examined}. Those of Jeffreys are in the record.")


def needed_lines(found: PriorSensitivity) -> list[str]:
    """Return the least prior probability that leads to the wanted posterior."""
    name = one_line(found.comparison.hypothesis)
    wanted = as_written(found.posterior)
    title = f"Prior probability that {name} needs for a posterior probability of {wanted}, against these two"
    rows = [["prior of the strength", "ln B", "prior probability at least"]]
    for one in found.needed:
        label = one.by if one.by not in _CLASSES else f"{_CLASSES[one.by]}, at its largest"
        rows.append([label, fixed(one.ln_bayes_factor, 2), _probability(one.probability, one.error)])
    lines = [*heading(title.removesuffix(", against these two")), *columns(rows, "lrl")]
    stated = found.comparison.prior_odds / (1.0 + found.comparison.prior_odds)
    return lines + bullet(f"Declared between these two hypotheses: {_probability(stated, 0.0)}.")


def _probability(value: float, error: float) -> str:
    decimals = 4 if 1e-3 < value < 0.999 else 6
    text = fixed(value, decimals)
    return f"{text} ± {fixed(error, decimals)}" if error >= 10.0**-decimals else text


def _events(number: float) -> str:
    return f"{_plain(number)} events"


def _plain(number: float) -> str:
    return fixed(number, 1) if 0.95 <= number < 99.5 else trimmed(number)


def _marked(text: str, mean: float, found: PriorSensitivity) -> str:
    return text + ("*" if abs(math.log(mean / found.declared.mean)) < 1e-6 else " ")


def _told(one: Average) -> str:
    if one.ln_bayes_factor is None:
        return f"<{fixed(LEAST_TOLD, 0)}"
    return fixed(one.ln_bayes_factor, 2)


def _reached(bound: Bound) -> str:
    if bound.low is None or bound.high is None:
        return ""
    low, high = trimmed(bound.low), trimmed(bound.high)
    return f"a point at {high}" if bound.low == bound.high else f"uniform from {low} to {high}"


def _both_signs(boundaries: Sequence[float]) -> Iterator[float]:
    yield from (-one for one in reversed(boundaries))
    yield from boundaries


def _is_passed(found: PriorSensitivity, boundary: float) -> bool:
    """Tell whether any member of a family with some width has passed a boundary."""
    wide = [family for family in found.families if family.name != "point"]
    averages = [one.ln_bayes_factor for family in wide for one in family.averages]
    values = [LEAST_TOLD if value is None else value for value in averages]
    return max(values) >= boundary if boundary > 0.0 else min(values) <= boundary


def _range_words(found: Sequence[Range]) -> str:
    if not found:
        return "none"
    return ", ".join(_one_range(low, high) for low, high in found)


def _one_range(low: float | None, high: float | None) -> str:
    if low is None and high is None:
        return "all"
    if low is None:
        return f"to {trimmed(high or 0.0)}"
    return f"from {trimmed(low)}" if high is None else f"{trimmed(low)} to {trimmed(high)}"
