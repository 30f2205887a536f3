"""What random analyses are made of: sizes, priors of every family, templates, sources of uncertainty."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np
import numpy.typing as npt
from scipy import optimize, special

from workbench.counts.binning import Binning
from workbench.counts.region import Region
from workbench.counts.table import Table
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
from workbench.hypotheses.uncertainties import Effect, Uncertainty

Array = npt.NDArray[np.float64]
Rng = np.random.Generator

UNIT = 3.0  # significance of a signal of strength 1 [standard deviations]


@dataclass(frozen=True)
class Draft:
    """An analysis that has not counted yet, and what its counts are drawn from.

    Attributes:
        analysis: everything declared; its regions have no observed counts.
        truth: signal parameters' names to their numbers; nuisance parameters are drawn from their priors.
        beside: region to (bin,) factors on the expected events: counts drawn beside the model.
        forced: region to (bin,) counts that are given instead of drawn.
    """

    analysis: Analysis
    truth: Mapping[str, float]
    beside: Mapping[str, Array] = field(default_factory=dict)
    forced: Mapping[str, Array] = field(default_factory=dict)


def between(rng: Rng, low: float, high: float) -> float:
    """Return a number whose logarithm is uniform, with four digits."""
    return float(f"{np.exp(rng.uniform(np.log(low), np.log(high))):.4g}")


def number(rng: Rng, low: float, high: float) -> float:
    """Return a uniform number with four digits."""
    return float(f"{rng.uniform(low, high):.4g}")


def bins(rng: Rng, low: int = 1, high: int = 200) -> int:
    """Return a number of bins."""
    return round(between(rng, low, high))


def significance(rng: Rng) -> float:
    """Return how strong the signal in the counts is: none once in five times, else up to 8."""
    return 0.0 if rng.random() < 0.2 else number(rng, 0.0, 8.0)


def events_of(shape: Array, background: Array, sigmas: float) -> float:
    """Return the events of a signal of this shape that are so significant if nothing else is unknown."""
    if sigmas <= 0.0:
        return 0.0
    part = shape / shape.sum()

    def excess(ln_events: float) -> float:
        s = np.exp(ln_events) * part
        square = 2.0 * (special.xlog1py(s + background, s / background) - s).sum()
        return float(np.sqrt(max(square, 0.0)) - sigmas)

    return float(np.exp(optimize.brentq(excess, -20.0, 30.0)))


def yield_and_strength(rng: Rng, shape: Array, background: Array) -> tuple[float, float]:
    """Return the events of strength 1 and the strength in the counts."""
    unit = events_of(shape, background, UNIT)
    return float(f"{unit:.4g}"), events_of(shape, background, significance(rng)) / unit


def strength_prior(rng: Rng) -> Prior:
    """Return a prior of some family on a strength of the order of 1."""
    size = between(rng, 0.5, 3.0)
    families: tuple[Prior, ...] = (
        Uniform(0.0, float(f"{3.0 * size:.4g}")),
        Uniform(0.0, 5.0),
        Exponential(size),
        HalfNormal(size),
        Gamma(number(rng, 0.7, 4.0), number(rng, 0.5, 3.0)),
        LogNormal(size, number(rng, 1.3, 3.0)),
        LogUniform(0.01, float(f"{4.0 * size:.4g}")),
        Normal(1.0, number(rng, 0.3, 1.5), low=0.0),
        Beta(number(rng, 0.8, 3.0), number(rng, 0.8, 3.0), 0.0, float(f"{4.0 * size:.4g}")),
    )
    return families[rng.integers(len(families))]


def level_prior(rng: Rng, level: float, spread: float) -> Prior:
    """Return a prior of some family around a level, with a relative spread."""
    level = float(f"{level:.4g}")
    shape = float(f"{spread**-2:.4g}")
    families: tuple[Prior, ...] = (
        LogNormal(level, float(f"{np.exp(spread):.4g}")),
        Gamma(shape, float(f"{shape / level:.4g}")),
        Normal(level, float(f"{spread * level:.4g}"), low=float(f"{0.02 * level:.3g}")),
        Uniform(
            float(f"{level * max(0.02, 1.0 - 1.7 * spread):.4g}"),
            float(f"{level * (1.0 + 1.7 * spread):.4g}"),
        ),
        LogUniform(
            float(f"{level * np.exp(-2.0 * spread):.4g}"), float(f"{level * np.exp(2.0 * spread):.4g}")
        ),
        Beta(
            2.0,
            2.0,
            float(f"{level * max(0.02, 1.0 - 2.0 * spread):.4g}"),
            float(f"{level * (1.0 + 2.0 * spread):.4g}"),
        ),
    )
    return families[rng.integers(len(families))]


def smooth_template(rng: Rng, size: int, events: float) -> Array:
    """Return (bin,) a smooth positive template with this many events."""
    x = np.linspace(-1.0, 1.0, size) if size > 1 else np.zeros(1)
    ln_height = rng.normal(0.0, 0.8) * x + rng.normal(0.0, 0.5) * x * x
    height = np.exp(ln_height)
    return np.asarray(np.round(events * height / height.sum(), 6) + 1e-6)


def bump_template(rng: Rng, size: int) -> Array:
    """Return (bin,) a bump somewhere in the range, summing up to 1."""
    x = (np.arange(size) + 0.5) / size
    centre, sd = rng.uniform(0.1, 0.9), between(rng, min(max(0.02, 0.6 / size), 0.3), 0.4)
    height = np.exp(-0.5 * ((x - centre) / sd) ** 2)
    return np.asarray(np.round(height / height.sum(), 9) + 1e-9)


def factor_size(rng: Rng, largest: float = 0.4) -> tuple[float, float | None]:
    """Return up and down of a change of size: one number, or two that may lie on one side."""
    up = between(rng, 0.01, largest)
    kind = rng.random()
    if kind < 0.5:
        return up, None
    return up, (-number(rng, 0.3, 1.0) if kind < 0.85 else number(rng, 0.2, 0.9)) * up


def random_sources(
    rng: Rng, total: int, processes: Sequence[str], largest: float = 0.3
) -> tuple[Uncertainty, ...]:
    """Return sources that change the size of one to three processes each."""
    found = []
    for place in range(total):
        touched = rng.choice(len(processes), size=min(len(processes), int(rng.integers(1, 4))), replace=False)
        effects = tuple(Effect(processes[index], *factor_size(rng, largest)) for index in touched)
        found.append(Uncertainty(f"source {place + 1}", effects))
    return tuple(found)


def planned(
    name: str, edges: Array, columns: Mapping[str, Array], errors: Mapping[str, Array] | None = None
) -> Region:
    """Return a region that has not counted yet."""
    table = Table(Binning.from_edges(edges), None, dict(columns), dict(errors or {}))
    return Region(name, table, template_errors=bool(errors))
