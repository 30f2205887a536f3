"""Numbers with an error as a text prints them, held against those of another run."""

from __future__ import annotations

import math
import re
from dataclasses import dataclass

NUMBER = r"[-−+]?\d[\d,]*(?:\.\d+)?"
_WITH_ERROR = re.compile(rf"({NUMBER}) ± ({NUMBER})")


@dataclass(frozen=True)
class Measured:
    """A printed value with its error, and half of the value's last digit."""

    value: float
    error: float
    rounding: float


def number(text: str) -> float:
    """Return a printed number, its thousands set apart by commas or not."""
    return float(text.replace(",", "").replace("−", "-"))


def measured(text: str) -> list[Measured]:
    """Return each "value ± error" in a text."""
    return [
        Measured(number(value), number(error), 0.5 * 10.0 ** -len(value.partition(".")[2]))
        for value, error in _WITH_ERROR.findall(text)
    ]


def strays(saved: str, again: str) -> list[str]:
    """Return what moved by more than 5 of its errors, or is not there any more."""
    before, after = measured(saved), measured(again)
    if len(before) != len(after):
        return [f"{len(before)} numbers with an error before, {len(after)} now"]
    return [
        f"{old.value} ± {old.error} before, {new.value} ± {new.error} now"
        for old, new in zip(before, after, strict=True)
        if abs(new.value - old.value) > 5.0 * math.hypot(old.error, new.error) + 2.0 * old.rounding
    ]
