"""The reader for histogram tables in CSV and TSV."""

from __future__ import annotations

import csv
import difflib
import math
import re
from dataclasses import dataclass
from pathlib import Path
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from workbench.counts.binning import FINITE, Binning, order_problems
from workbench.counts.files import digest_of, read_bytes, text_of
from workbench.counts.magnitudes import LARGEST
from workbench.counts.places import Places, as_written, listed
from workbench.counts.table import (
    BIN_COLUMNS,
    ERROR_ENDING,
    Table,
    name_problems,
    negative_template_problems,
    value_problems,
)
from workbench.errors import InputError, Problem, quoted

Array = npt.NDArray[np.float64]

_NUMBER = re.compile(r"[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?", re.ASCII)
_DECIMAL_COMMA = re.compile(r"[+-]?\d+,\d+", re.ASCII)
_NOT_FINITE = frozenset({"nan", "inf", "infinity"})


@dataclass(frozen=True, slots=True)
class _Line:
    number: int
    cells: tuple[str, ...]


def read_csv_table(path: Path, shown: str | None = None, *, negative_templates: str = "refuse") -> Table:
    """Return the histogram that a CSV or TSV file holds.

    The first line names the columns: `low`, `high`, `observed` (left out when planning), then one column a
    template, and optionally `NAME error` for the standard deviations of the template NAME. Lines starting
    with # and blank lines are passed over. Tabs separate the cells if the first line has tabs, and no commas
    unless the file's name ends in .tsv; else commas do.

    Args:
        path: the file.
        shown: its name as the user gave it, for messages and records; the path itself if left out.
        negative_templates: the choice of the region that the table is for. It refuses template bins below
            zero itself; where the table is refused already, they are told of together with the rest.

    Returns:
        The table, with the line of every bin and the digest of the file's bytes.

    Raises:
        InputError: with everything that keeps the file from being a histogram, each with its line and column.

    Source:
        none, definition
    """
    shown = str(path) if shown is None else shown
    data = read_bytes(path, shown)
    lines = _lines(text_of(data, shown), shown, path.suffix.lower() == ".tsv")
    header, rows = lines[0], lines[1:]
    problems = _header_problems(header, shown)
    if problems:
        raise InputError(*problems)
    names = header.cells
    problems = _ragged_problems(rows, len(names), shown)
    rows = [row for row in rows if len(row.cells) == len(names)]
    cells = {name: [row.cells[index] for row in rows] for index, name in enumerate(names)}
    places = Places(shown, tuple(row.number for row in rows), cells, header.number)
    return _table(places, digest_of(data), problems, may_be_negative=negative_templates == "zero")


def _table(places: Places, digest: str, problems: list[Problem], *, may_be_negative: bool) -> Table:
    """Return the table from its cells, or raise what is wrong with them beside the problems known so far."""
    parsed = {name: _numbers(name, places) for name in places.cells}
    numbers = {name: values for name, (values, _) in parsed.items()}
    observed = numbers.get("observed")
    columns, errors = {}, {}
    for name, values in numbers.items():
        if name.endswith(ERROR_ENDING):
            errors[name.removesuffix(ERROR_ENDING)] = values
        elif name not in BIN_COLUMNS:
            columns[name] = values
    problems = problems + [problem for _, found in parsed.values() for problem in found]
    problems += name_problems(columns, errors, places)
    problems += order_problems(numbers["low"], numbers["high"], places)
    problems += value_problems(observed, errors, places)
    if problems:
        raise InputError(*problems, *([] if may_be_negative else negative_template_problems(columns, places)))
    binning = Binning(numbers["low"], numbers["high"])
    return Table(binning, observed, columns, errors, places.source, digest, places.lines)


def _lines(text: str, shown: str, is_tsv: bool) -> list[_Line]:
    """Return the header and the lines of numbers, each cut into cells without the spaces around them."""
    kept = [
        (number, line)
        for number, line in enumerate(text.split("\n"), start=1)
        if line.strip() and not line.lstrip().startswith("#")
    ]
    if len(kept) < 2:
        raise InputError(_empty(text, bool(kept), shown))
    first = kept[0][1]
    delimiter = "\t" if "\t" in first and (is_tsv or "," not in first) else ","
    if delimiter not in first and ";" in first:
        raise InputError(
            Problem(
                "Cells that are separated by semicolons",
                f"{shown}, line {kept[0][0]}",
                as_written(first.strip()),
                "commas between the cells and points in the numbers (or tabs, in a .tsv file)",
                "save the file again with the comma as separator and 1.5 written for one and a half",
            )
        )
    return [_Line(number, _cells(line, number, delimiter, shown)) for number, line in kept]


def _empty(text: str, has_names: bool, shown: str) -> Problem:
    return Problem(
        "A table without bins" if has_names else "An empty table",
        shown,
        "a line of column names, nothing below it"
        if has_names
        else "only comments"
        if text.strip()
        else "nothing",
        "a line of column names, then one line a bin",
        "write the columns low,high,observed and one line a bin below them",
    )


def _cells(line: str, number: int, delimiter: str, shown: str) -> tuple[str, ...]:
    try:
        (cells,) = csv.reader([line], delimiter=delimiter, skipinitialspace=True, strict=True)
    except csv.Error as error:
        raise InputError(
            Problem(
                "A line that can't be cut into cells",
                f"{shown}, line {number}",
                as_written(line),
                "cells on one line, quotes closed where opened",
                "close the quotes, or leave them out: only names with a comma need them",
            )
        ) from error
    return tuple(cell.strip() for cell in cells)


def _header_problems(header: _Line, shown: str) -> list[Problem]:
    where = f"{shown}, line {header.number}"
    names = header.cells
    if all(_NUMBER.fullmatch(name) for name in names):
        return [
            Problem(
                "A table without column names",
                where,
                as_written(",".join(names)),
                "the names of the columns on the first line",
                "write a first line such as low,high,observed,background",
            )
        ]
    problems = [_missing(name, names, where) for name in ("low", "high") if name not in names]
    if "observed" not in names and difflib.get_close_matches(
        "observed", [name.lower() for name in names], 1, 0.7
    ):
        problems.append(_missing("observed", names, where))
    problems += [
        Problem(
            "Two columns of the same name",
            f"{where}, column {quoted(name)}",
            f"{quoted(name)} {names.count(name)} times",
            "each name once",
            "rename one of the columns, or leave it out",
        )
        for name in dict.fromkeys(names)
        if name and names.count(name) > 1
    ]
    problems += [
        Problem(
            "A column without a name",
            f"{where}, column {index}",
            "nothing between the separators",
            "a name for every column",
            "name the column, or leave out the separator that opens it",
        )
        for index, name in enumerate(names, start=1)
        if not name
    ]
    return problems


def _missing(name: str, names: tuple[str, ...], where: str) -> Problem:
    lowered = {other.lower(): other for other in names if other}
    close = difflib.get_close_matches(name, lowered, n=1, cutoff=0.7)
    return Problem(
        f"A table without the column {quoted(name)}",
        where,
        "the columns " + listed([quoted(other) for other in names]),
        "low, high, observed, then one column a template",
        f"rename {quoted(lowered[close[0]])} to {quoted(name)}"
        if close
        else f"add the column {quoted(name)}",
    )


def _ragged_problems(rows: list[_Line], expected: int, shown: str) -> list[Problem]:
    found: dict[int, list[str]] = {}
    for row in rows:
        if len(row.cells) != expected:
            found.setdefault(len(row.cells), []).append(str(row.number))
    return [
        Problem(
            "Fewer cells than column names" if number < expected else "More cells than column names",
            f"{shown}, {'line' if len(lines) == 1 else 'lines'} {listed(lines)}",
            f"{number} cells",
            f"{expected}, one a column",
            "give every column a number, 0 where there is nothing"
            if number < expected
            else "leave out what is too much; if commas stand for decimal points, write 1.5 instead of 1,5",
        )
        for number, lines in found.items()
    ]


def _number(text: str) -> float:
    """Return a cell's number, nan where it holds none that can be used."""
    number = float(text) if _NUMBER.fullmatch(text) else math.nan
    return number if abs(number) <= LARGEST else math.nan


def _numbers(name: str, places: Places) -> tuple[Array, list[Problem]]:
    """Return a column as numbers, nan where a cell holds none, and what to say about those cells."""
    texts = places.cells[name]
    values = np.array([_number(text) for text in texts], dtype=np.float64)
    faults: dict[_Fault, list[int]] = {}
    for row in np.flatnonzero(np.isnan(values)).tolist():
        faults.setdefault(_fault(texts[row]), []).append(row)
    return values, [
        Problem(
            fault.what,
            places.where(rows, name),
            places.found(rows, name, values) or "nothing",
            fault.expected,
            fault.remedy,
        )
        for fault, rows in faults.items()
    ]


class _Fault(NamedTuple):
    what: str
    expected: str
    remedy: str


_EMPTY = _Fault("An empty cell", "a number", "write 0 if nothing was counted or predicted")
_UNBOUNDED = _Fault("Numbers that are not finite", FINITE, "find out what made it; an empty bin is written 0")
_COMMA = _Fault("A decimal comma", "a number with a decimal point", "write 1.5 for one and a half")
_WORD = _Fault("A cell that holds no number", "a number", "write a plain number such as 12, 0.5 or 3e-2")


def _fault(text: str) -> _Fault:
    """Return what is wrong with a cell that holds no finite number."""
    if not text:
        return _EMPTY
    if text.lstrip("+-").lower() in _NOT_FINITE or _NUMBER.fullmatch(text):
        return _UNBOUNDED
    return _COMMA if _DECIMAL_COMMA.fullmatch(text) else _WORD
