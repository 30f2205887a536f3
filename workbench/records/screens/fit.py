"""The screen of `fit`: one block a hypothesis, correlations apart."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence

from workbench.likelihood.results import Fit, Fitted
from workbench.records.numbers import fixed, significant, with_sides, with_two_digits
from workbench.records.outcomes import FitOutcome
from workbench.records.screens.counted import NONE, best_of, counted_lines, title_lines
from workbench.records.screens.layout import aligned_at, bullet, columns, heading, one_line, paragraph, screen

NOTABLE = 0.2
LEGEND = (
    "pull: distance from the prior's mean in its standard deviations; + is above.",
    "contraction: 1 − (error / the prior's standard deviation)^2; 0: the data say nothing, 1: they decide.",
)


def fit_screen(outcome: FitOutcome) -> str:
    """Return what `fit` found as text.

    Args:
        outcome: what was found.
    """
    lines = title_lines(outcome.analysis, outcome.origin)
    for note in outcome.origin.notes:
        lines += paragraph(note)
    lines += counted_lines(outcome.analysis)
    for fit in outcome.fits:
        lines += fit_lines(fit)
    if any(fit.fitted for fit in outcome.fits):
        lines += ["", *(line for sentence in LEGEND for line in paragraph(sentence))]
    for fit in outcome.fits:
        lines += correlation_lines(fit)
    if outcome.analysis.cautions:
        lines += heading("Warnings")
        for caution in outcome.analysis.cautions:
            lines += bullet(caution.text)
    return screen(lines)


def fit_lines(fit: Fit) -> list[str]:
    """Return one hypothesis' block: how the fit ended, then a line a parameter."""
    under = f", with {one_line(fit.alternative)}: {best_of(fit)}" if fit.others else ""
    lines = heading(f"Fit of {one_line(fit.hypothesis)}{under}")
    ending = fit.ending.value
    height = f" ln likelihood {fixed(fit.ln_likelihood, 3)}." if math.isfinite(fit.ln_likelihood) else ""
    lines += paragraph(f"{ending[0].upper()}{ending[1:]}.{height}")
    if fit.fitted:
        header = ["parameter", "value", "pull", "contraction"]
        values = aligned_values(fit.fitted)
        body = [
            [_name(item), value, _signed(item.pull), _contraction(item)]
            for item, value in zip(fit.fitted, values, strict=True)
        ]
        lines += ["", *columns([header, *body], "llrr")]
    for note in fit.notes:
        lines += bullet(f"{note[0].upper()}{note[1:].removesuffix('.')}.")
    return lines + _other_lines(fit)


def _other_lines(fit: Fit) -> list[str]:
    """Return the other alternatives' fits: how far below the best, and what they say of signal parameters."""
    if not fit.others:
        return []
    signals = [item.name for item in fit.fitted if item.role == "signal"]
    rows = [["alternative", "penalised ln likelihood", "below the best", *map(one_line, signals)]]
    for one in (fit, *fit.others):
        heights = [fixed(value, 3) for value in (one.penalised, fit.penalised - one.penalised)]
        values = {item.name: value_text(item) for item in one.fitted}
        is_known = math.isfinite(one.penalised)
        rows.append(
            [
                one_line(one.alternative),
                *(heights if is_known else [NONE, NONE]),
                *(values.get(name, NONE) for name in signals),
            ]
        )
    for place in range(3, 3 + len(signals)):
        cells = aligned_at(" ", [row[place] for row in rows[1:]])
        for row, cell in zip(rows[1:], cells, strict=True):
            row[place] = cell
    return ["", *columns(rows, "lrr" + "l" * len(signals))]


def correlation_lines(fit: Fit) -> list[str]:
    """Return the correlations above 0.2 in size, largest first."""
    rows = [
        [_signed(value), f"{one_line(first)}, {one_line(second)}"]
        for value, first, second in notable_correlations(fit)
    ]
    if not rows:
        return []
    title = f"Correlations beyond ±{NOTABLE:g} under {one_line(fit.hypothesis)}"
    return [*heading(title), *columns(rows, "rl")]


def notable_correlations(fit: Fit, above: float = NOTABLE) -> Iterator[tuple[float, str, str]]:
    """Yield (correlation, parameter, parameter) of each strongly correlated pair, largest size first."""
    pairs = [
        (float(fit.correlations[row, column]), fit.fitted[row].name, fit.fitted[column].name)
        for row in range(len(fit.fitted))
        for column in range(row + 1, len(fit.fitted))
        if abs(fit.correlations[row, column]) > above
    ]
    yield from sorted(pairs, key=lambda pair: -abs(pair[0]))


def aligned_values(fitted: Sequence[Fitted]) -> list[str]:
    """Return the value of each parameter with its error, the errors in one column."""
    return aligned_at(" ", [value_text(item) for item in fitted])


def value_text(item: Fitted) -> str:
    """Return a fitted value with its error: +high −low where these were asked for, ± otherwise."""
    if item.low is not None or item.high is not None:
        return with_sides(item.value, item.low, item.high)
    if item.error is None:
        return f"{significant(item.value, 4)} no error"
    return with_two_digits(item.value, item.error, 2 if item.role == "source" else 0)


def _name(item: Fitted) -> str:
    return one_line(f"{item.name} [{item.unit}]" if item.unit else item.name)


def _contraction(item: Fitted) -> str:
    return NONE if item.contraction is None else fixed(item.contraction, 2)


def _signed(value: float | None) -> str:
    if value is None:
        return NONE
    text = fixed(value, 2)
    return text if text.startswith("−") else f"+{text}"
