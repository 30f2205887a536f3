"""How a process' events spread over the bins of a region."""

from __future__ import annotations

from dataclasses import dataclass
from types import MappingProxyType
from typing import ClassVar, Final

from workbench.hypotheses.shapes.continua import Bernstein, Falling, Flat, PowerLaw
from workbench.hypotheses.shapes.crystal_ball import CrystalBall
from workbench.hypotheses.shapes.family import AnalyticShape
from workbench.hypotheses.shapes.peaks import BreitWigner, Gaussian
from workbench.hypotheses.shapes.voigt import Voigt


@dataclass(frozen=True, slots=True)
class Template:
    """Expected events per bin from a column of the region's table.

    Attributes:
        column: the column's name.
    """

    family: ClassVar[str] = "template"
    column: str


@dataclass(frozen=True, slots=True)
class Templates:
    """Templates at several values of a parameter, interpolated bin by bin.

    Attributes:
        parameter: the parameter's name.
        at: its values, ascending.
        columns: the column for each of them.
    """

    family: ClassVar[str] = "templates"
    parameter: str
    at: tuple[float, ...]
    columns: tuple[str, ...]


Shape = (
    Flat
    | Falling
    | PowerLaw
    | Bernstein
    | Gaussian
    | BreitWigner
    | Voigt
    | CrystalBall
    | Template
    | Templates
)

SHAPES: Final[MappingProxyType[str, type[Shape]]] = MappingProxyType(
    {
        Flat.family: Flat,
        Falling.family: Falling,
        PowerLaw.family: PowerLaw,
        Bernstein.family: Bernstein,
        Gaussian.family: Gaussian,
        BreitWigner.family: BreitWigner,
        Voigt.family: Voigt,
        CrystalBall.family: CrystalBall,
        Template.family: Template,
        Templates.family: Templates,
    }
)

__all__ = [
    "SHAPES",
    "AnalyticShape",
    "Bernstein",
    "BreitWigner",
    "CrystalBall",
    "Falling",
    "Flat",
    "Gaussian",
    "PowerLaw",
    "Shape",
    "Template",
    "Templates",
    "Voigt",
]
