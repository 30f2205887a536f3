"""What ensembles of pseudo-experiments answer."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Adequacy:
    """Does a hypothesis describe the data at all.

    Attributes:
        hypothesis: its name.
        statistic: T = 2 (ln p of the saturated model - largest penalised ln p).
        p: (1 + pseudo-experiments with T at least as large)/(1 + their number).
        p_error: its standard error.
        pseudo_experiments: how many were drawn.
        unfinished_fits: how many pseudo-experiments' fits did not converge (counted, kept in).
        alternative: the alternative of the backgrounds that was judged; empty where there is no doubt.
    """

    hypothesis: str
    statistic: float
    p: float
    p_error: float
    pseudo_experiments: int
    unfinished_fits: int
    alternative: str = ""

    @property
    def fails(self) -> bool:
        """Return True when p < 0.01."""
        return self.p < 0.01
