"""A hypothesis: a list of processes with a prior probability."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from workbench.hypotheses.distortion import Distortion
from workbench.hypotheses.frozen import FrozenMapping


@dataclass(frozen=True, slots=True)
class Hypothesis:
    """A list of processes with a prior probability, some parameters perhaps held.

    Attributes:
        name: the hypothesis' name.
        processes: names of the processes that it is made of.
        prior: prior probability relative to the other hypotheses'; > 0.
        fix: parameter name to the number that it is held at.
        distortion: by how much its backgrounds may be wrong in shape; None where they are taken as declared.
    """

    name: str
    processes: tuple[str, ...]
    prior: float = 1.0
    fix: Mapping[str, float] = field(default_factory=dict)
    distortion: Distortion | None = None

    def __post_init__(self) -> None:
        object.__setattr__(self, "processes", tuple(self.processes))
        object.__setattr__(self, "fix", FrozenMapping(self.fix))
