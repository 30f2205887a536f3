"""What power-scaling a nuisance prior answers."""

from __future__ import annotations

import enum
from collections.abc import Sequence
from dataclasses import dataclass


class Driver(enum.Enum):
    """What a nuisance parameter's posterior rests on; the value is the word for the user."""

    DATA = "data-driven"
    PRIOR = "prior-driven"
    BOTH = "both"
    CONFLICT = "in conflict"
    FLAT = "flat prior"


@dataclass(frozen=True, slots=True)
class PowerChange:
    """How ln B changes when one nuisance prior is raised to a power, in every hypothesis that has it.

    Attributes:
        power: the power; below 1 the prior is wider.
        ln_change: change of ln B [nats]; None where the prior has no such power or it is not established.
        error: one standard error of it [nats]; None with it.
        k_hat: Pareto shape of the reweighted draws, the larger of the hypotheses'; None without.
        is_fresh: True where the draws were too uneven and the evidences were made again.
    """

    power: float
    ln_change: float | None
    error: float | None
    k_hat: float | None
    is_fresh: bool


@dataclass(frozen=True, slots=True)
class PowerScaling:
    """How one nuisance parameter answers to powers of its prior and of the likelihood.

    Attributes:
        parameter, role: its name; "nuisance" or "source".
        prior: its prior in words.
        by_prior, by_prior_error: sensitivity of its posterior to its prior, with one standard error.
        by_data, by_data_error: sensitivity to the likelihood.
        tension: distance of prior and data in standard deviations, as if both were normal; None where the
            data say too little.
        driver: what its posterior rests on.
        changes: what ln B does, one a power.
    """

    parameter: str
    role: str
    prior: str
    by_prior: float
    by_prior_error: float
    by_data: float
    by_data_error: float
    tension: float | None
    driver: Driver
    changes: tuple[PowerChange, ...]


def most_moving(scalings: Sequence[PowerScaling], most: int) -> tuple[PowerScaling, ...]:
    """Return the entries to show where there are many: those in conflict, and those that move ln B most.

    Args:
        scalings: every nuisance prior to powers.
        most: how many to return.

    Returns:
        Entries in the order given; all where they are few.
    """

    def urgency(one: PowerScaling) -> tuple[bool, float]:
        size = max((abs(change.ln_change or 0.0) for change in one.changes), default=0.0)
        return one.driver is Driver.CONFLICT, size

    kept = {id(one) for one in sorted(scalings, key=urgency, reverse=True)[:most]}
    return tuple(one for one in scalings if id(one) in kept)
