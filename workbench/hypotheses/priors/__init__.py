"""Prior families. Every prior is proper."""

from __future__ import annotations

from types import MappingProxyType
from typing import Final

from workbench.hypotheses.jets import Derivatives
from workbench.hypotheses.priors.beta import Beta
from workbench.hypotheses.priors.family import ContinuousPrior, Moments
from workbench.hypotheses.priors.gamma import Gamma
from workbench.hypotheses.priors.normal import Normal
from workbench.hypotheses.priors.ranges import Fixed, LogUniform, Uniform
from workbench.hypotheses.priors.scales import Exponential, HalfNormal, LogNormal

Prior = Uniform | Normal | LogNormal | Gamma | Exponential | HalfNormal | LogUniform | Beta | Fixed

FAMILIES: Final[MappingProxyType[str, type[Prior]]] = MappingProxyType(
    {
        family.family: family
        for family in (
            Uniform,
            Normal,
            LogNormal,
            Gamma,
            Exponential,
            HalfNormal,
            LogUniform,
            Beta,
            Fixed,
        )
    }
)

__all__ = [
    "FAMILIES",
    "Beta",
    "ContinuousPrior",
    "Derivatives",
    "Exponential",
    "Fixed",
    "Gamma",
    "HalfNormal",
    "LogNormal",
    "LogUniform",
    "Moments",
    "Normal",
    "Prior",
    "Uniform",
]
