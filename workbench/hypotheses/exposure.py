"""Exposure: what yields are proportional to."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

EXPOSURE_SOURCE: Final = "exposure"  # the reserved name of the source that `uncertainty` makes


@dataclass(frozen=True, slots=True)
class Exposure:
    """What yields are proportional to; `uncertainty` is a source named "exposure"."""

    collected: float
    unit: str = ""
    uncertainty: float | None = None
