"""Prior families. Every prior is proper."""

from __future__ import annotations

from types import MappingProxyType
from typing import Final

from workbench.hypotheses.beta_prior import Beta
from workbench.hypotheses.gamma_prior import Gamma
from workbench.hypotheses.jets import Derivatives
from workbench.hypotheses.normal_prior import Normal
from workbench.hypotheses.prior_family import ContinuousPrior, Moments
from workbench.hypotheses.range_priors import Fixed, LogUniform, Uniform
from workbench.hypotheses.scale_priors import Exponential, HalfNormal, LogNormal

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
