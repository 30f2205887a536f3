"""The analysis that a histogram file alone stands for."""

from __future__ import annotations

import math

from workbench.counts.region import Region
from workbench.counts.table import Table
from workbench.errors import InputError, Problem, quoted
from workbench.hypotheses.analysis import Analysis, default_hypotheses
from workbench.hypotheses.file.priors import parse_prior
from workbench.hypotheses.parameters import Parameter
from workbench.hypotheses.priors import Prior, Uniform
from workbench.hypotheses.processes import Contribution, Process
from workbench.hypotheses.shapes import Template
from workbench.hypotheses.uncertainties import Effect, Uncertainty

__all__ = ["DEFAULT_STRENGTH", "analysis_from_table", "parse_prior"]

DEFAULT_STRENGTH: Prior = Uniform(0.0, 5.0)
REGION = "counts"
SIGNAL = "signal"
STRENGTH = "strength"


def analysis_from_table(
    table: Table,
    *,
    strength: Prior = DEFAULT_STRENGTH,
    background_uncertainty: float = 0.10,
    title: str | None = None,
) -> Analysis:
    """Return the analysis that a table's column names declare.

    Columns named `signal` or `signal ...` are signal and share one strength; every other column is a
    background with an uncertainty of its own. Error columns enter the likelihood.

    Args:
        table: a histogram table.
        strength: prior of the signal strength, in units of the signal columns.
        background_uncertainty: relative size of each background's uncertainty; 0 for none.
        title: the analysis' title; made from the table's name if left out.

    Returns:
        The analysis, with "background only" and "signal plus background" equally probable.

    Raises:
        InputError: if there is no signal column or no background column, or a number makes no sense.

    Source:
        none, definition
    """
    signals = [name for name in table.columns if is_signal(name)]
    backgrounds = [name for name in table.columns if not is_signal(name)]
    problems = [
        *_column_problems(table, signals, backgrounds),
        *_size_problems(background_uncertainty),
        *_strength_problems(strength),
    ]
    if problems:
        raise InputError(*problems)
    processes = [Process(name, "background", _template(name)) for name in backgrounds]
    processes += [Process(name, "signal", _template(name), (STRENGTH,)) for name in signals]
    sources = [
        Uncertainty(f"{name} normalisation", (Effect(name, float(background_uncertainty)),))
        for name in backgrounds
    ]
    return Analysis(
        title=f"Histogram {table.source}" if title is None else title,
        regions=(Region(REGION, table, template_errors=bool(table.errors)),),
        parameters=(Parameter(STRENGTH, strength),),
        processes=tuple(processes),
        uncertainties=tuple(sources) if background_uncertainty > 0 else (),
        hypotheses=default_hypotheses(processes),
    )


def is_signal(column: str) -> bool:
    """Tell whether a column's name makes it signal."""
    return column == SIGNAL or column.startswith(f"{SIGNAL} ")


def _template(column: str) -> dict[str, Contribution]:
    return {REGION: Contribution(Template(column))}


def _column_problems(table: Table, signals: list[str], backgrounds: list[str]) -> list[Problem]:
    listed = ", ".join(quoted(name) for name in table.columns) or "no template columns"
    problems = []
    if not signals:
        problems.append(
            Problem(
                "A histogram without a signal column",
                table.source,
                listed,
                'a column named "signal", or "signal ...": the events expected at strength 1',
                "rename the signal's column, or write an analysis file that says which process is signal",
            )
        )
    if signals and not backgrounds:
        problems.append(
            Problem(
                "A histogram without a background column",
                table.source,
                listed,
                "at least one column that is not signal: the events expected without it",
                "add the column of the background",
            )
        )
    return problems


def _size_problems(size: float) -> list[Problem]:
    if math.isfinite(size) and size >= 0:
        return []
    return [
        Problem(
            "An uncertainty of the backgrounds below 0",
            "--background-uncertainty",
            f"{size:g}",
            "a relative size >= 0: 0.10 is ten per cent",
            "write the size without a sign, 0 for none",
        )
    ]


def _strength_problems(strength: Prior) -> list[Problem]:
    low, _ = strength.support
    if low >= 0:
        return []
    return [
        Problem(
            "A strength that can be negative",
            "--strength",
            strength.text(),
            "a prior on numbers of at least 0: expected counts are never negative",
            "let it start at 0: a normal prior takes low = 0",
        )
    ]
