"""A parameter: an unknown number with a prior."""

from __future__ import annotations

from dataclasses import dataclass

from workbench.hypotheses.priors import Prior


@dataclass(frozen=True, slots=True)
class Parameter:
    """An unknown number with a prior.

    Attributes:
        name: the parameter's name.
        prior: what is believed about it beforehand; always proper.
        unit: its unit.
    """

    name: str
    prior: Prior
    unit: str = ""
