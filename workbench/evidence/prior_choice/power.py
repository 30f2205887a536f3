"""Priors raised to a power: narrower for powers above 1, wider below, in the family that they were in."""

from __future__ import annotations

from dataclasses import replace

from workbench.errors import InputError
from workbench.hypotheses.priors import Beta, Exponential, Gamma, HalfNormal, LogNormal, Normal, Prior


def powered(prior: Prior, power: float) -> Prior | None:
    """Return the prior whose density is the given one to a power, normalised again.

    The density is that in x, in ln x for lognormal and loguniform, as in a fit's penalty:
        normal, half-normal: sd/sqrt(a);  lognormal: ln factor/sqrt(a);  exponential: mean/a;
        gamma: shape a (k - 1) + 1, rate a r;  beta: exponents a (e - 1) + 1

    Args:
        prior: a prior with a density.
        power: a; > 0.

    Returns:
        The powered prior; None where it would be improper or cannot be worked with, and where the density is
        flat, so that no power changes it.

    Source:
        None, definition.
    """
    if prior.is_flat:
        return None
    try:
        return _powered(prior, power)
    except InputError:
        return None


def _powered(prior: Prior, power: float) -> Prior | None:
    root = power**-0.5
    match prior:
        case Normal() | HalfNormal():
            return replace(prior, sd=prior.sd * root)
        case LogNormal():
            return replace(prior, factor=prior.factor**root)
        case Exponential():
            return replace(prior, mean=prior.mean / power)
        case Gamma():
            return replace(prior, shape=power * (prior.shape - 1.0) + 1.0, rate=power * prior.rate)
        case Beta():
            return replace(prior, a=power * (prior.a - 1.0) + 1.0, b=power * (prior.b - 1.0) + 1.0)
        case _:
            return None
