"""Processes: a yield and a shape in each region."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

from workbench.hypotheses.frozen import FrozenMapping
from workbench.hypotheses.quantities import Quantity, parameters_of
from workbench.hypotheses.shapes import Shape, Template, Templates


@dataclass(frozen=True, slots=True)
class Contribution:
    """What a process puts into one region.

    Attributes:
        shape: how its events spread over the bins.
        events: expected events for the collected exposure (the file's `yield`); None: the template's own sum.
    """

    shape: Shape
    events: Quantity | None = None

    @property
    def quantities(self) -> dict[str, Quantity]:
        """Return what stands for numbers here: the yield, and the shape's numbers under their names."""
        given: dict[str, Quantity] = {} if self.events is None else {"yield": self.events}
        if not isinstance(self.shape, Template | Templates):
            given |= self.shape.quantities
        return given

    @property
    def parameters(self) -> tuple[str, ...]:
        """Return the names of the parameters that it depends on, in the order met."""
        names: dict[str, None] = {}
        for quantity in self.quantities.values():
            names |= dict.fromkeys(parameters_of(quantity))
        if isinstance(self.shape, Templates):
            names[self.shape.parameter] = None
        return tuple(names)


@dataclass(frozen=True, slots=True)
class Process:
    """One source of events.

    Attributes:
        name: the process' name.
        kind: "background" or "signal".
        regions: region name to what it contributes there.
        factors: numbers or parameter names that multiply the yield in every region.
        follows_exposure: False keeps the yield when the exposure changes.
    """

    name: str
    kind: Literal["background", "signal"]
    regions: Mapping[str, Contribution]
    factors: tuple[float | str, ...] = ()
    follows_exposure: bool = True

    def __post_init__(self) -> None:
        object.__setattr__(self, "regions", FrozenMapping(self.regions))
        object.__setattr__(self, "factors", tuple(self.factors))

    @property
    def is_signal(self) -> bool:
        """Tell whether the process is part of what is searched for."""
        return self.kind == "signal"

    @property
    def parameters(self) -> tuple[str, ...]:
        """Return the names of the parameters that it depends on, in the order met."""
        names = dict.fromkeys(one for one in self.factors if isinstance(one, str))
        for contribution in self.regions.values():
            names |= dict.fromkeys(contribution.parameters)
        return tuple(names)
