"""Exposure: what yields are proportional to."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

EXPOSURE_SOURCE: Final = "exposure"  # the reserved name of the source that `uncertainty` makes


@dataclass(frozen=True, slots=True)
class Exposure:
    """What yields are proportional to.

    Attributes:
        collected: how much of it the yields and counts stand for; > 0.
        unit: its unit.
        uncertainty: relative size of a source named "exposure" on all that follows exposure; None for none.
    """

    collected: float
    unit: str = ""
    uncertainty: float | None = None
