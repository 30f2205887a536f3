"""Processes: a yield and a shape in each region, or several descriptions that compete."""

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
class Alternative:
    """One of several descriptions of a background process, of which one holds, in all regions at once.

    Attributes:
        name: the alternative's name.
        regions: region name to what the process contributes there if this description holds.
        prior: prior probability relative to the process' other alternatives; > 0.
    """

    name: str
    regions: Mapping[str, Contribution]
    prior: float = 1.0

    def __post_init__(self) -> None:
        object.__setattr__(self, "regions", FrozenMapping(self.regions))


@dataclass(frozen=True, slots=True)
class Process:
    """One source of events.

    Attributes:
        name: the process' name.
        kind: "background" or "signal".
        regions: region name to what it contributes there; with alternatives, where all of them agree.
        factors: numbers or parameter names that multiply the yield in every region.
        follows_exposure: False keeps the yield when the exposure changes.
        alternatives: descriptions of a background of which one holds; none where there is no doubt.
    """

    name: str
    kind: Literal["background", "signal"]
    regions: Mapping[str, Contribution]
    factors: tuple[float | str, ...] = ()
    follows_exposure: bool = True
    alternatives: tuple[Alternative, ...] = ()

    def __post_init__(self) -> None:
        object.__setattr__(self, "regions", FrozenMapping(self.regions))
        object.__setattr__(self, "alternatives", tuple(self.alternatives))
        object.__setattr__(self, "factors", tuple(self.factors))

    @property
    def is_signal(self) -> bool:
        """Tell whether the process is part of what is searched for."""
        return self.kind == "signal"

    @property
    def region_names(self) -> tuple[str, ...]:
        """Return the names of the regions that it contributes to, each once."""
        return tuple(dict.fromkeys(description.region for description in self.descriptions))

    @property
    def descriptions(self) -> tuple[Description, ...]:
        """Return what it contributes to each region, every alternative's word included."""
        own = (Description(("regions", name), name, one) for name, one in self.regions.items())
        others = (
            Description(("alternatives", alternative.name, "regions", name), name, one)
            for alternative in self.alternatives
            for name, one in alternative.regions.items()
        )
        return (*own, *others)

    @property
    def parameters(self) -> tuple[str, ...]:
        """Return the names of the parameters that it depends on, whichever alternative holds."""
        names = dict.fromkeys(one for one in self.factors if isinstance(one, str))
        for description in self.descriptions:
            names |= dict.fromkeys(description.contribution.parameters)
        return tuple(names)


@dataclass(frozen=True, slots=True)
class Description:
    """What a process contributes to a region, and where that is said.

    Attributes:
        place: keys that lead to it from the process.
        region: the region's name.
        contribution: what it contributes there.
    """

    place: tuple[str, ...]
    region: str
    contribution: Contribution

    @property
    def alternative(self) -> str:
        """Return the alternative that says so; empty where all agree."""
        return self.place[1] if self.place[0] == "alternatives" else ""
