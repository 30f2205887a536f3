"""Aligned columns, wrapped sentences and framed warnings for a terminal of 80 to 100 columns."""

from __future__ import annotations

import textwrap
from collections.abc import Iterable, Sequence

WIDTH = 80
WIDEST = 100
LAST = 48
INDENT = "  "

_ASCII = str.maketrans(
    {
        "±": "+/-",
        "−": "-",
        "×": "x",
        "·": "-",
        "–": "-",
        "═": "=",
        "…": "...",
        "≥": ">=",
        "≤": "<=",
        "½": "1/2",
        "†": "#",
        "│": "|",
        "█": "#",
        "◂": "<",
    }
)


def plain_ascii(text: str) -> str:
    """Return a screen in ASCII, for a terminal that can show nothing else."""
    return text.translate(_ASCII).encode("ascii", "backslashreplace").decode("ascii")


def one_line(text: str) -> str:
    """Return a name or title on one line, whatever white space or control characters it holds."""
    return " ".join("".join(mark if mark.isprintable() else " " for mark in text).split())


def named(text: str) -> str:
    """Return a name of the user's as sentences have it: whole, on one line, in double quotes."""
    return f'"{one_line(text)}"'


def heading(text: str) -> list[str]:
    """Return a section's heading with an empty line before it."""
    return ["", text]


def paragraph(text: str, indent: str = INDENT, first: str | None = None) -> list[str]:
    """Return a sentence wrapped to the width; `first` replaces the indent of the first line."""
    return textwrap.wrap(
        one_line(text),
        WIDTH,
        initial_indent=indent if first is None else first,
        subsequent_indent=indent,
        break_long_words=True,
        break_on_hyphens=False,
    )


def bullet(text: str) -> list[str]:
    """Return a sentence as one point of a list."""
    return paragraph(text, INDENT + "  ", INDENT + "· ")


def framed(title: str, sentences: Iterable[str]) -> list[str]:
    """Return a block between two rules, for what must not be missed."""
    rule = "═" * WIDTH
    lines = [rule, *paragraph(title, "  ")]
    for sentence in sentences:
        lines += paragraph(sentence, "  ")
    return [*lines, rule]


def aligned_at(mark: str, cells: Sequence[str]) -> list[str]:
    """Return cells padded on the left so that the first `mark` of each stands in one column."""
    before = [cell.find(mark) if mark in cell else len(cell) for cell in cells]
    widest = max(before, default=0)
    return [" " * (widest - place) + cell for place, cell in zip(before, cells, strict=True)]


def columns(rows: Sequence[Sequence[str]], sides: str, indent: str = INDENT) -> list[str]:
    """Return rows with their columns aligned; what does not fit beside the first column goes under it.

    The last column is wrapped where it is too long; the others are as wide as what they hold.

    Args:
        rows: cells of each row, all rows of one length, the header first.
        sides: one letter a column: "l" left, "r" right.
        indent: what every line starts with.
    """
    widths = [max(len(row[place]) for row in rows) for place in range(len(sides))]
    if sides[-1] == "l":
        widths[-1] = min(widths[-1], LAST)  # a longer one is wrapped
    rest = len(indent) + sum(widths[1:]) + 2 * (len(sides) - 1)
    widths[0] = min(widths[0], max(WIDEST - rest, 16))
    lines: list[str] = []
    for row in rows:
        first = row[0]
        if len(first) > widths[0]:
            lines += textwrap.wrap(first, WIDEST, initial_indent=indent, subsequent_indent=indent + "  ")
            first = ""
        padded = [
            cell.ljust(width) if side == "l" else cell.rjust(width)
            for cell, width, side in zip([first, *row[1:-1]], widths[:-1], sides[:-1], strict=True)
        ]
        before = indent + "".join(cell + "  " for cell in padded)
        lines += _last_cell(before, row[-1], widths[-1], sides[-1])
    return lines


def _last_cell(before: str, cell: str, width: int, side: str) -> list[str]:
    """Return a line ended by its last cell, which is wrapped under itself where it is too long."""
    room = max(WIDEST - len(before), 20)
    if side == "r" or len(cell) <= room:
        return [(before + (cell.rjust(width) if side == "r" else cell)).rstrip()]
    parts = textwrap.wrap(cell, room, break_on_hyphens=False)
    return [before + parts[0], *(" " * len(before) + part for part in parts[1:])]


def wide_columns(header: Sequence[str], rows: Sequence[Sequence[str]], indent: str = INDENT) -> list[str]:
    """Return a table of a label and many right-aligned columns, broken into several where it is too wide."""
    label = max(len(row[0]) for row in [header, *rows])
    lines: list[str] = []
    start = 1
    while start < len(header):
        stop, used = start, len(indent) + min(label, 40)
        while stop < len(header):
            used += 2 + max(len(row[stop]) for row in [header, *rows])
            if used > WIDEST and stop > start:
                break
            stop += 1
        block = [[row[0], *row[start:stop]] for row in [header, *rows]]
        lines += ([""] if lines else []) + columns(block, "l" + "r" * (stop - start), indent)
        start = stop
    return lines


def screen(lines: Iterable[str]) -> str:
    """Return lines as one text that ends with a line feed."""
    return "\n".join(line.rstrip() for line in lines) + "\n"
