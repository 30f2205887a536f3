"""Evidences by summing the likelihood over a dense grid: slow, plain, and no part of what it checks."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.hypotheses.priors import Prior
from workbench.likelihood.model import Model

Array = npt.NDArray[np.float64]
Rule = tuple[Array, Array]

_ROWS = 20_000


def panels(*ends: float, nodes: int = 20) -> Rule:
    """Return nodes and weights of Gauss-Legendre rules between neighbouring ends."""
    x, w = np.polynomial.legendre.leggauss(nodes)
    low, half = np.array(ends[:-1])[:, None], 0.5 * np.diff(ends)[:, None]
    return (low + half * (1.0 + x)).ravel(), (half * w).ravel()


def under(prior: Prior, *ends: float, nodes: int = 20) -> Rule:
    """Return the same with the prior's density in the weights."""
    x, w = panels(*ends, nodes=nodes)
    return x, w * np.exp(prior.ln_density(x))


def standard_normal(nodes: int = 20) -> Rule:
    """Return a rule for a standard-normal average, to 8 standard deviations."""
    z, w = panels(*np.linspace(-8.0, 8.0, 9), nodes=nodes)
    return z, w * np.exp(-0.5 * z * z) / np.sqrt(2.0 * np.pi)


def ln_evidence(model: Model, rules: Mapping[str, Rule]) -> float:
    """Return the ln evidence summed over the product of one rule a coordinate."""
    assert model.observed is not None
    given = [rules[name] for name in model.names]
    points = np.stack([part.ravel() for part in np.meshgrid(*(x for x, _ in given), indexing="ij")], axis=1)
    with np.errstate(divide="ignore"):
        ln_weight = np.zeros(1)
        for _, weight in given:
            ln_weight = (ln_weight[:, None] + np.log(weight)).ravel()
    values = [
        model.ln_likelihood(model.natural_seeds(points[first : first + _ROWS]), model.observed)
        for first in range(0, len(points), _ROWS)
    ]
    return float(special.logsumexp(np.concatenate(values) + ln_weight))
