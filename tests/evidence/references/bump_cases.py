"""Random analyses along an observable: bumps of unknown mass and width on continua of every shape."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import numpy.typing as npt
from scipy import special

from tests.evidence.references.ingredients import (
    UNIT,
    Draft,
    Rng,
    between,
    bins,
    events_of,
    level_prior,
    number,
    planned,
    random_sources,
    significance,
    strength_prior,
)
from workbench.hypotheses.analysis import Analysis, Parameter
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
from workbench.hypotheses.processes import Contribution, Process
from workbench.hypotheses.shapes import (
    Bernstein,
    BreitWigner,
    CrystalBall,
    Falling,
    Gaussian,
    PowerLaw,
    Shape,
)

Array = npt.NDArray[np.float64]
LOW, HIGH = 10.0, 110.0


def _peak(edges: Array, mass: float, sd: float) -> Array:
    return np.asarray(np.diff(special.ndtr((edges - mass) / sd)) + 1e-12)


def _continuum(rng: Rng) -> tuple[Shape, list[Parameter]]:
    """Return a shape without a peak, with one or two free parameters or none."""
    kind = rng.integers(5)
    if kind == 0:
        return Falling(between(rng, 15.0, 80.0)), []
    if kind == 1:
        scale = between(rng, 15.0, 80.0)
        return Falling("scale"), [Parameter("scale", level_prior(rng, scale, between(rng, 0.02, 0.3)))]
    if kind == 2:
        index = Normal(number(rng, 1.2, 3.0), between(rng, 0.02, 0.5))
        return PowerLaw("index"), [Parameter("index", index)]
    if kind == 3:
        first, second = level_prior(rng, 0.7, 0.3), Beta(number(rng, 1.0, 4.0), 2.0, 0.05, 1.5)
        return Bernstein((1.0, "first", "second")), [
            Parameter("first", first),
            Parameter("second", second),
        ]
    return Bernstein((1.0, number(rng, 0.3, 1.0), number(rng, 0.2, 0.8))), []


def _hunt(
    rng: Rng,
    title: str,
    seen: Callable[[Array, float], tuple[float, float]],
    *,
    strength: Prior | None = None,
    sources: int = 5,
    finest: float = 0.01,
) -> Draft:
    """Return a bump of unknown mass.

    Args:
        rng: where the random numbers come from.
        title: the analysis' title.
        seen: from (edge,) edges and resolution to mass and significance of the bump in the counts.
        strength: the strength's prior; None for one of some family.
        sources: at most how many sources.
        finest: the least resolution in units of the range.
    """
    size = bins(rng, 20, 200)
    edges = np.round(np.linspace(LOW, HIGH, size + 1), 6)
    sd = float(f"{max(between(rng, finest, 0.1), 0.5 / size) * (HIGH - LOW):.4g}")
    shape, parameters = _continuum(rng)
    level = between(rng, 50.0, 20_000.0) if rng.random() < 0.9 else between(rng, 2e4, 3e5)
    mass, sigmas = seen(edges, sd)
    under = np.full(size, level / size)
    unit = float(f"{events_of(_peak(edges, mass, sd), under, UNIT):.4g}")
    truth = {"strength": events_of(_peak(edges, mass, sd), under, sigmas) / unit, "mass": mass}
    edge = 0.0 if rng.random() < 0.3 else 5.0
    factors: tuple[float | str, ...] = ()
    if rng.random() < 0.5:
        parameters.append(Parameter("size", level_prior(rng, 1.0, between(rng, 0.03, 0.3))))
        factors = ("size",)
    return Draft(
        Analysis(
            title,
            (planned("spectrum", edges, {}),),
            (
                Parameter("strength", strength or strength_prior(rng)),
                Parameter("mass", Uniform(LOW + edge, HIGH - edge)),
                *parameters,
            ),
            (
                Process("continuum", "background", {"spectrum": Contribution(shape, level)}, factors),
                Process(
                    "peak",
                    "signal",
                    {"spectrum": Contribution(Gaussian("mass", sd), unit)},
                    ("strength",),
                ),
            ),
            random_sources(rng, int(rng.integers(0, sources + 1)), ["continuum", "peak"]),
        ),
        truth,
    )


def unknown_masses(rng: Rng) -> Draft:
    """Return one bump somewhere, or none."""
    return _hunt(rng, "A bump of unknown mass", lambda _, __: (number(rng, 18.0, 102.0), significance(rng)))


def two_bumps(rng: Rng) -> Draft:
    """Return a hunt for one bump where the counts hold two."""
    places = number(rng, 20.0, 50.0), number(rng, 65.0, 100.0)
    heights = number(rng, 1.0, 5.0), number(rng, 1.0, 5.0)
    seen_at: list[tuple[Array, float]] = []

    def seen(edges: Array, sd: float) -> tuple[float, float]:
        seen_at.append((edges, sd))
        return places[0], heights[0]

    draft = _hunt(rng, "Two bumps where one is sought", seen)
    level = draft.analysis.process("continuum").regions["spectrum"].events
    assert isinstance(level, float)
    ((edges, sd),) = seen_at
    second, under = _peak(edges, places[1], sd), level / (edges.size - 1)
    ratio = second / second.sum() * events_of(second, np.full(second.size, under), heights[1]) / under
    return Draft(draft.analysis, draft.truth, beside={"spectrum": 1.0 + ratio})


def no_bumps(rng: Rng) -> Draft:
    """Return a hunt with nothing there, under priors near strength 0, where a mass means nothing."""
    size = between(rng, 0.05, 1.0)
    priors: tuple[Prior, ...] = (
        LogUniform(0.001, 3.0),
        Exponential(size),
        HalfNormal(size),
        Uniform(0.0, size),
        Gamma(0.5, 1.0),
    )
    strength = priors[rng.integers(len(priors))]
    return _hunt(rng, "No bump at all", lambda _, __: (number(rng, 20.0, 100.0), 0.0), strength=strength)


def unknown_widths(rng: Rng) -> Draft:
    """Return a peak of unknown mass, width and strength."""
    size = bins(rng, 15, 100)
    edges = np.round(np.linspace(LOW, HIGH, size + 1), 6)
    shapes: tuple[Shape, ...] = (
        BreitWigner("mass", "width"),
        Gaussian("mass", "width"),
        CrystalBall("mass", "width", 1.3, 3.0, 1.8, 4.0),
    )
    widths: tuple[Prior, ...] = (
        LogUniform(1.5, 12.0),
        LogNormal(4.0, number(rng, 1.2, 2.0)),
        Uniform(2.0, 10.0),
    )
    level, mass, sd = between(rng, 100.0, 20_000.0), number(rng, 30.0, 90.0), number(rng, 2.5, 7.0)
    continuum, parameters = _continuum(rng)
    under = np.full(size, level / size)
    unit = float(f"{events_of(_peak(edges, mass, sd), under, UNIT):.4g}")
    sigmas = significance(rng)
    shape = shapes[rng.integers(len(shapes))]
    masses: tuple[Prior, ...] = (Uniform(20.0, 100.0), Normal(mass, 10.0, low=15.0, high=105.0))
    return Draft(
        Analysis(
            "A peak of unknown mass and width",
            (planned("spectrum", edges, {}),),
            (
                Parameter("strength", strength_prior(rng)),
                Parameter("mass", masses[rng.integers(2)]),
                Parameter("width", widths[rng.integers(len(widths))]),
                *parameters,
            ),
            (
                Process("continuum", "background", {"spectrum": Contribution(continuum, level)}),
                Process("peak", "signal", {"spectrum": Contribution(shape, unit)}, ("strength",)),
            ),
            random_sources(rng, int(rng.integers(0, 4)), ["continuum", "peak"]),
        ),
        {
            "strength": events_of(_peak(edges, mass, sd), under, sigmas) / unit,
            "mass": mass,
            "width": sd,
        },
    )
