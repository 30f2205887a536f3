"""Sizes of uncertainties as they are shown and typed: +10 %, or a template column's name."""

from __future__ import annotations

import re
from collections.abc import Collection
from decimal import Decimal

from workbench.errors import InputError, Problem, nearest, quoted
from workbench.widgets.state.rows import Size

NUMBER = re.compile(
    r"(?P<sign>[+\-−]?)\s*(?P<digits>\d+(\.\d*)?|\.\d+)(?P<power>[eE][+\-]?\d{1,3})?\s*(?P<percent>%?)"
)
SURELY_RELATIVE = Decimal(1)  # a bare 10 is more likely to be meant as ten per cent than as tenfold


def size_text(size: Size | None) -> str:
    """Return a size as it is shown, with all its digits: "+10 %", "−4 %", a column's name; "" for None."""
    if size is None or isinstance(size, str):
        return size or ""
    percent = Decimal(repr(float(size))) * 100
    digits = f"{abs(percent):f}" if abs(percent.adjusted()) < 16 else f"{abs(percent)}"
    if "." in digits and "E" not in digits:
        digits = digits.rstrip("0").rstrip(".")
    return f"{'−' if percent < 0 else '+'}{digits} %"


def size_of_text(text: str, columns: Collection[str], where: str) -> Size:
    """Return the size that somebody typed.

    Args:
        text: "10 %", "+10%", "-0.04" (a relative size, as in a file), or a column's name.
        columns: template columns that may be named.
        where: the control, for messages.

    Returns:
        A relative change, or the column's name.

    Raises:
        InputError: if it is neither, or may mean per cent or not.

    Source:
        none, definition
    """
    typed = text.strip()
    if typed in columns:
        return typed
    match = NUMBER.fullmatch(typed)
    if match is None:
        expected = "a size such as +10 %" + (", or a template column" if columns else "")
        remedy = nearest(typed, [*columns]) if columns and typed else "write a number and %"
        raise InputError(Problem("A size that cannot be read", where, quoted(text), expected, remedy))
    number = Decimal(match["digits"] + (match["power"] or ""))
    if match["percent"]:
        number /= 100
    elif number >= SURELY_RELATIVE:
        raise InputError(
            Problem(
                "A size that may be meant in per cent",
                where,
                quoted(text),
                "a number with %, or a relative size below 1",
                f"write {typed} % if per cent is meant",
            )
        )
    return float(number if match["sign"] in {"", "+"} else -number)
