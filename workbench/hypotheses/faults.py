"""Faults of an analysis, named by the key that holds them, and the places they are shown at.

A fault knows the key path only; the reader of a file adds the file and the line, Python shows the path alone.
"""

from __future__ import annotations

import math
import re
from collections.abc import Callable, Mapping
from dataclasses import dataclass

from workbench.counts.magnitudes import WORKABLE, is_workable
from workbench.errors import Problem, quoted, shortened

KeyPath = tuple[str | int, ...]
Place = Callable[[KeyPath], str]

BARE_KEY = re.compile(r"[A-Za-z0-9_-]+")


@dataclass(frozen=True, slots=True)
class Fault:
    """One thing wrong with what a key holds."""

    path: KeyPath
    what: str
    found: str
    expected: str
    remedy: str

    def problem(self, place: Place) -> Problem:
        """Return the problem with its place in words."""
        return Problem(self.what, place(self.path), self.found, self.expected, self.remedy)


def number_fault(path: KeyPath, number: float) -> Fault | None:
    """Return the fault of a number that is not finite, too large or too small; None where it is neither."""
    if is_workable(number):
        return None
    if not abs(number) < math.inf:
        what = "A number that is not finite"
        return Fault(path, what, shown(number), "a finite number", "write a finite number")
    what = f"A number too {'large' if abs(number) > 1 else 'small'} to be worked with"
    remedy = "write it in other units" if abs(number) > 1 else "write 0, or use other units"
    return Fault(path, what, shown(number), WORKABLE, remedy)


def dotted(path: KeyPath) -> str:
    """Return a key path as the file would write it, list positions in brackets from 1."""
    text = ""
    for step in path:
        if isinstance(step, int):
            text += f"[{step + 1}]"
        else:
            text += ("." if text else "") + (step if BARE_KEY.fullmatch(step) else quoted(step))
    return text


def field_path(key: str) -> KeyPath:
    """Return the key path of a shape's number from its name, such as coefficients[0]."""
    name, _, rest = key.partition("[")
    return (name, int(rest.rstrip("]"))) if rest else (name,)


def toml_fault_text(text: str) -> str:
    """Return what the standard library's TOML reader found, in words that say what it is."""
    path = text.replace("('", "").replace("', '", ".").replace("',)", "").replace("')", "")
    return path.replace("Invalid", "Unreadable").replace("invalid", "unreadable").replace("'", '"')


def shown(value: object) -> str:
    """Return a value as the file would write it, on one line, cut where it is long."""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, int) and value.bit_length() > 64:
        return f"a whole number of {value.bit_length()} bits"
    if isinstance(value, int | float):
        return f"{value:.15g}"
    if isinstance(value, str):
        return quoted(value)
    if isinstance(value, list | tuple):
        return shortened(
            "[" + ", ".join(shown(one) for one in value[:6]) + (", ..." if len(value) > 6 else "") + "]"
        )
    if isinstance(value, Mapping):
        inner = ", ".join(f"{dotted((str(key),))} = {shown(one)}" for key, one in list(value.items())[:4])
        return shortened("{ " + inner + " }") if inner else "an empty table"
    return shortened(str(value))
