"""Where the numbers of a table stand, in the words of whoever gave them."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np
import numpy.typing as npt

from workbench.errors import quoted

_MOST = 5  # things of one kind that are listed one by one
_LONGEST = 60  # characters of a cell that are shown


def number_text(value: float) -> str:
    """Return a number as one would type it: whole numbers without a point, others with all their digits."""
    number = float(value)
    return str(int(number)) if number.is_integer() and abs(number) < 1e16 else repr(number)


@dataclass(frozen=True, slots=True)
class Places:
    """Says where a bin's number stands and how it was written.

    Attributes:
        source: the file's name as the user gave it, or a description of where the data came from.
        lines: (bin,) line numbers in the file; empty when there is no file, then bins are counted from 1.
        cells: column name to (bin,) text as written, where there is a text.
        header: line number of the column names in the file; None when there is no file.
    """

    source: str
    lines: tuple[int, ...] = ()
    cells: Mapping[str, Sequence[str]] = field(default_factory=dict)
    header: int | None = None

    def column(self, name: str) -> str:
        """Return where a column is named."""
        line = "" if self.header is None else f" line {self.header},"
        return f"{self.source},{line} column {quoted(name)}"

    def row(self, index: int) -> str:
        """Return the name of one bin's row."""
        return f"line {self.lines[index]}" if self.lines else f"bin {index + 1}"

    def where(self, rows: npt.ArrayLike, column: str) -> str:
        """Return where some bins' numbers of one column stand."""
        indices = np.atleast_1d(np.asarray(rows, dtype=np.intp)).tolist()
        if len(indices) == 1:
            return f"{self.source}, {self.row(indices[0])}, column {quoted(column)}"
        numbers = [self.lines[index] if self.lines else index + 1 for index in indices]
        word = "lines" if self.lines else "bins"
        return f"{self.source}, {word} {listed([str(number) for number in numbers])}, column {quoted(column)}"

    def found(self, rows: npt.ArrayLike, column: str, values: npt.NDArray[np.float64]) -> str:
        """Return some bins' numbers of one column, as they were written."""
        indices = np.atleast_1d(np.asarray(rows, dtype=np.intp)).tolist()
        texts = [
            as_written(self.cells[column][index]) if column in self.cells else number_text(values[index])
            for index in indices
        ]
        return texts[0] if len(set(texts)) == 1 else listed(texts)


def as_written(text: str) -> str:
    """Return a file's text fit for a terminal: cut when long, escaped when it holds control characters."""
    short = text if len(text) <= _LONGEST else text[: _LONGEST - 3] + "..."
    return short if short.isprintable() else quoted(short)


def listed(texts: Sequence[str]) -> str:
    """Return texts as a list in a sentence, a long one cut."""
    if len(texts) == 1:
        return texts[0]
    if len(texts) > _MOST + 1:
        return f"{', '.join(texts[:_MOST])} and {len(texts) - _MOST} others"
    return f"{', '.join(texts[:-1])} and {texts[-1]}"
