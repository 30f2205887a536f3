"""A bump with two uncertainties, and how its updating ratio is read; invented."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import numpy.typing as npt
from scipy import stats

from tests.evidence.small_analyses import bump, source
from workbench.evidence.ratio.results import Scan
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.priors import (
    Beta,
    Exponential,
    Gamma,
    HalfNormal,
    LogNormal,
    LogUniform,
    Normal,
    Prior,
    Uniform,
)

Array = npt.NDArray[np.float64]

TO_FIVE = Uniform(0.0, 5.0)
STRENGTH_PRIORS: list[Prior] = [
    Uniform(0.0, 7.0),
    Exponential(0.8),
    HalfNormal(2.0),
    Gamma(0.5, 1.0),
    Gamma(3.0, 2.0),
    LogUniform(1e-3, 9.0),
    LogNormal(1.0, 1.5),
    Beta(0.5, 0.5, 0.0, 6.0),
    Normal(1.2, 0.01, 0.0),
    Normal(2.0, 1.0, 0.0, 8.0),
]


def observed_bump() -> Array:
    """Return invented counts: a falling continuum with a peak of 24 events at 7.3."""
    edges = np.linspace(0.0, 20.0, 41)
    falling = -np.expm1(-edges / 8.0) / -np.expm1(-20.0 / 8.0)
    expected = 400.0 * np.diff(falling) + 24.0 * np.diff(stats.norm.cdf(edges, 7.3, 0.4))
    counts: Array = np.random.default_rng(8).poisson(expected).astype(float)
    return counts


def uncertain_bump() -> Analysis:
    sources = (source("size", continuum=0.06), source("efficiency", peak=(0.10, -0.07)))
    return bump(observed_bump(), strength=TO_FIVE, uncertainties=sources)


def read(found: Scan, *points: tuple[float, ...]) -> tuple[Array, Array]:
    """Return ln R and errors at points whose values stand in the order of `over`."""
    order = [found.over.index(name) for name in found.known.names]
    ln_ratio, error = found.known.at(np.array(points)[:, order])
    return ln_ratio, error


def held(analysis: Analysis, **values: float) -> Analysis:
    """Return the analysis whose second hypothesis holds parameters."""
    first, second = analysis.hypotheses
    return replace(analysis, hypotheses=(first, replace(second, fix=values)))
