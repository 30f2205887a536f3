"""A histogram table as read: bins, observed counts, template columns and their errors."""

from __future__ import annotations

import difflib
from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np
import numpy.typing as npt

from workbench.counts.binning import Binning, locked, not_finite_problem
from workbench.counts.files import digest_of
from workbench.counts.places import Places
from workbench.errors import InputError, Problem, quoted

Array = npt.NDArray[np.float64]

BIN_COLUMNS = ("low", "high", "observed")
ERROR_ENDING = " error"
LARGEST_COUNT = 2**53 - 1  # the last whole number that double precision tells from its neighbours


@dataclass(frozen=True, slots=True, eq=False)
class Table:
    """What a histogram file holds; any arrays of numbers are taken, copied and locked.

    Template columns may hold negative numbers here: whether these are refused is the region's choice.

    Attributes:
        binning: the bins.
        observed: (bin,) counted events [events], integers >= 0; None when planning.
        columns: template name to (bin,) expected events [events].
        errors: template name to (bin,) standard deviations of the template's own statistics [events]; >= 0.
        source: the file's name as the user gave it, or a description for data given in Python.
        digest: "sha256:..." of the file's bytes, or of the numbers when there is no file.
        lines: (bin,) line numbers in the file; empty when there is no file.

    Raises:
        InputError: with everything that is wrong with the numbers.
    """

    binning: Binning
    observed: Array | None
    columns: Mapping[str, Array] = field(default_factory=dict)
    errors: Mapping[str, Array] = field(default_factory=dict)
    source: str = "Python"
    digest: str = ""
    lines: tuple[int, ...] = ()

    def __post_init__(self) -> None:
        places = self.places
        observed = None if self.observed is None else locked(self.observed, "observed", places)
        columns = {name: locked(values, name, places) for name, values in self.columns.items()}
        errors = {name: locked(values, name + ERROR_ENDING, places) for name, values in self.errors.items()}
        named = _named(observed, columns, errors)
        problems = length_problems(self.binning.number, named, places)
        problems += [found for name in named if (found := not_finite_problem(named[name], name, places))]
        problems += value_problems(observed, errors, places)
        problems += name_problems(columns, errors, places)
        if problems:
            raise InputError(*problems)
        object.__setattr__(self, "observed", observed)
        object.__setattr__(self, "columns", columns)
        object.__setattr__(self, "errors", errors)
        if not self.digest:
            object.__setattr__(self, "digest", _digest_of_numbers(self.binning, named))

    @property
    def places(self) -> Places:
        """Return where the numbers stand, for messages about them."""
        return Places(self.source, self.lines)


def _named(
    observed: Array | None, columns: Mapping[str, Array], errors: Mapping[str, Array]
) -> dict[str, Array]:
    named = {} if observed is None else {"observed": observed}
    return named | dict(columns) | {name + ERROR_ENDING: values for name, values in errors.items()}


def _digest_of_numbers(binning: Binning, named: Mapping[str, Array]) -> str:
    parts = {"low": binning.low, "high": binning.high} | dict(named)
    return digest_of(
        b"".join(f"{name}\n".encode() + parts[name].astype("<f8").tobytes() for name in sorted(parts))
    )


def length_problems(bins: int, named: Mapping[str, Array], places: Places) -> list[Problem]:
    """Return what is wrong with the lengths of columns."""
    return [
        Problem(
            "A column of another length than the bins",
            places.column(name),
            f"{values.size} numbers",
            f"{bins}, one a bin",
            "give every bin a number, 0 where there is nothing",
        )
        for name, values in named.items()
        if values.size != bins
    ]


def name_problems(
    columns: Mapping[str, object], errors: Mapping[str, object], places: Places
) -> list[Problem]:
    """Return what is wrong with the names of templates and with errors that belong to none."""
    problems = [
        Problem(
            "A template with a name that means something else",
            places.column(name),
            quoted(name),
            f"any name but {', '.join(BIN_COLUMNS)}",
            "rename the template",
        )
        for name in columns
        if name in BIN_COLUMNS or not name.strip()
    ]
    return problems + [_orphan(name, columns, places) for name in errors if name not in columns]


def _orphan(name: str, columns: Mapping[str, object], places: Places) -> Problem:
    remedy = f"add the column {quoted(name)}, or leave its errors out"
    close = difflib.get_close_matches(name, columns, n=1)
    if close:
        remedy = f"rename it to {quoted(close[0] + ERROR_ENDING)}, or add the column {quoted(name)}"
    if name in BIN_COLUMNS:
        remedy = "leave it out: the law of the counts says how far they spread"
    return Problem(
        "Errors of a template that is not there",
        places.column(name + ERROR_ENDING),
        f"no column {quoted(name)}"
        if name not in BIN_COLUMNS
        else f"errors of {quoted(name)}, which is no template",
        "the name of one of the templates: " + (", ".join(columns) or "(there are none)"),
        remedy,
    )


def value_problems(observed: Array | None, errors: Mapping[str, Array], places: Places) -> list[Problem]:
    """Return what is wrong with counts and errors, numbers that are not finite left aside."""
    problems = [] if observed is None else count_problems(observed, places)
    for name, values in errors.items():
        rows = np.flatnonzero(values < 0)
        if rows.size:
            column = name + ERROR_ENDING
            problems.append(
                Problem(
                    "Errors below zero",
                    places.where(rows, column),
                    places.found(rows, column, values),
                    "one standard deviation, >= 0",
                    "give the size of the error without a sign",
                )
            )
    return problems


def count_problems(observed: Array, places: Places) -> list[Problem]:
    """Return what keeps numbers from being counts: a sign, a fraction, more digits than can be kept."""
    finite = np.isfinite(observed)
    whole = np.floor(observed) == observed
    faults = (
        (
            finite & (observed < 0),
            "Observed counts below zero",
            "whole numbers >= 0",
            "give the counts before any subtraction; backgrounds go into template columns",
        ),
        (
            finite & (observed >= 0) & ~whole,
            "Observed counts that are not whole numbers",
            "whole numbers: weighted or scaled events don't follow a counting law",
            "give the number of events counted; weights and scale factors belong to the templates",
        ),
        (
            finite & whole & (observed > LARGEST_COUNT),
            "Observed counts too large to be kept exactly",
            f"at most {LARGEST_COUNT}",
            "check the column; counts up to there are kept to the last event",
        ),
    )
    return [
        Problem(
            what, places.where(rows, "observed"), places.found(rows, "observed", observed), expected, remedy
        )
        for is_faulty, what, expected, remedy in faults
        if (rows := np.flatnonzero(is_faulty)).size
    ]


def negative_template_problems(columns: Mapping[str, Array], places: Places) -> list[Problem]:
    """Return what to say about templates' bins below zero, one problem a template that has them."""
    return [
        Problem(
            "Template bins below zero",
            places.where(rows, name),
            places.found(rows, name, values),
            "expected events >= 0",
            'merge bins, or write negative_templates = "zero" in the region of an analysis file, which is '
            "then reported",
        )
        for name, values in columns.items()
        if (rows := np.flatnonzero(values < 0)).size
    ]
