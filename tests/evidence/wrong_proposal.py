"""A proposal that is wrong on purpose, for negative controls."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from workbench.evidence.integral.proposal import Proposal

Array = npt.NDArray[np.float64]


class Wrong:
    """A proposal whose density claims to be higher than it is."""

    def __init__(self, right: Proposal, shift: float) -> None:
        self.right, self.shift = right, shift

    def __getattr__(self, name: str) -> object:
        return getattr(self.right, name)

    def ln_density(self, points: Array) -> Array:
        return self.right.ln_density(points) + self.shift
