"""Invented analyses of the sizes at which engines break: a line a bin wide, and hundreds of sources."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from tests.analyses import background, region_of, signal, with_observed
from workbench.hypotheses.analysis import Analysis, Parameter
from workbench.hypotheses.priors import Normal, Uniform
from workbench.hypotheses.shapes import Falling, Gaussian, Template
from workbench.hypotheses.uncertainties import Effect, Uncertainty
from workbench.likelihood.model import compile_model

Array = npt.NDArray[np.float64]


def narrow_line(bins: int = 400, *, injected: float = 0.0) -> Analysis:
    """Return a line of unknown mass whose resolution is 1/800 of the range, on 4,000 background events.

    Args:
        bins: number of bins.
        injected: strength of the line in the counts, at a mass of 44.
    """
    edges = np.linspace(20.0, 80.0, bins + 1)
    analysis = Analysis(
        "Narrow line",
        (region_of(edges, np.zeros(bins)),),
        (
            Parameter("strength", Uniform(0.0, 5.0)),
            Parameter("mass", Uniform(20.0, 80.0)),
            Parameter("scale", Normal(18.0, 0.5)),
        ),
        (
            background("continuum", Falling("scale"), 4000.0),
            signal("line", Gaussian("mass", 60.0 / 800.0), 20.0, "strength"),
        ),
        (
            Uncertainty("size", (Effect("continuum", 0.1),)),
            Uncertainty("efficiency", (Effect("line", 0.05),)),
            Uncertainty("livetime", (Effect("line", 0.02), Effect("continuum", 0.02))),
        ),
    )
    return drawn(analysis, {"strength": injected, "mass": 44.0}, seed=3)


def many_sources(bins: int, sources: int, *, by_bin: int) -> Analysis:
    """Return four backgrounds of a million events, a wide peak, and hundreds of sources of a per cent.

    Args:
        bins: number of bins.
        sources: number of sources.
        by_bin: how many of them are template variations; the others scale whole processes.
    """
    generator = np.random.default_rng(5)
    edges = np.linspace(0.0, 100.0, bins + 1)
    x = 0.5 * (edges[1:] + edges[:-1])
    columns = {f"b{k}": 2.5e5 / bins * np.exp(-x / (20.0 + 10.0 * k)) for k in range(4)}
    nominal = dict(columns)
    uncertainties = []
    for number in range(sources):
        process = f"b{number % 4}"
        if number < by_bin:
            wave = generator.normal(scale=0.01, size=3)
            ln_ratio = wave[0] * np.sin(x / 8.0 + number) + wave[1] * np.cos(x / 15.0) + wave[2] * x / 100.0
            up, down = f"up {number}", f"down {number}"
            columns[up] = nominal[process] * np.exp(ln_ratio)
            columns[down] = nominal[process] * np.exp(-ln_ratio)
            effects: tuple[Effect, ...] = (Effect(process, up, down),)
        else:
            size, efficiency = generator.uniform(0.002, 0.02), generator.uniform(0.002, 0.01)
            effects = (Effect(process, float(size)), Effect("peak", float(efficiency)))
        uncertainties.append(Uncertainty(f"source {number}", effects))
    analysis = Analysis(
        "Many sources",
        (region_of(edges, np.zeros(bins), columns),),
        (Parameter("strength", Uniform(0.0, 5.0)),),
        (
            *(background(name, Template(name)) for name in nominal),
            signal("peak", Gaussian(40.0, 1.5), 500.0, "strength"),
        ),
        tuple(uncertainties),
    )
    return drawn(analysis, {"strength": 1.0}, seed=6)


def drawn(analysis: Analysis, held: dict[str, float], seed: int) -> Analysis:
    """Return an analysis with counts drawn at some parameter values, every source at its own draw."""
    model = compile_model(analysis, "signal plus background")
    generator = np.random.default_rng(seed)
    point = generator.standard_normal((1, model.size))
    values = model.seeds(point).x
    for name, value in held.items():
        values[model.names.index(name)] = value
    expected, _ = model.expected(model.natural_seeds(values.T))
    return with_observed(analysis, generator.poisson(expected[0]).astype(float))
