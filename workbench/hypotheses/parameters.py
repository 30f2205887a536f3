"""A parameter: an unknown number with a prior."""

from __future__ import annotations

from dataclasses import dataclass

from workbench.hypotheses.priors import Prior


@dataclass(frozen=True, slots=True)
class Parameter:
    """An unknown number with a prior."""

    name: str
    prior: Prior
    unit: str = ""
