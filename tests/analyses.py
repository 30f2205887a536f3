"""Small invented analyses for the tests, declared in Python."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace

import numpy as np
import numpy.typing as npt

from workbench.counts.binning import Binning
from workbench.counts.region import Region
from workbench.counts.table import Table
from workbench.hypotheses.analysis import Analysis, Exposure, Hypothesis, Parameter
from workbench.hypotheses.priors import (
    Beta,
    Exponential,
    Fixed,
    Gamma,
    HalfNormal,
    LogNormal,
    LogUniform,
    Normal,
    Prior,
    Uniform,
)
from workbench.hypotheses.processes import Contribution, Process
from workbench.hypotheses.quantities import Curve, Quantity
from workbench.hypotheses.shapes import (
    Bernstein,
    BreitWigner,
    CrystalBall,
    Falling,
    Flat,
    Gaussian,
    PowerLaw,
    Shape,
    Template,
    Templates,
    Voigt,
)
from workbench.hypotheses.uncertainties import Effect, Uncertainty
from workbench.likelihood.model import compile_model
from workbench.likelihood.results import Fit, Fitted

Array = npt.NDArray[np.float64]
WIDE = Uniform(0.0, 100.0)
BOTH = "signal plus background"


def region_of(
    edges: Sequence[float] | Array,
    observed: Sequence[float] | Array | None = None,
    columns: Mapping[str, Sequence[float] | Array] | None = None,
    errors: Mapping[str, Sequence[float] | Array] | None = None,
    *,
    name: str = "only",
    empty_bin_events: float | None = None,
) -> Region:
    """Return a region; its error columns, where given, enter the likelihood."""
    table = Table(
        Binning.from_edges(edges),
        None if observed is None else np.asarray(observed, dtype=float),
        {key: np.asarray(column, dtype=float) for key, column in (columns or {}).items()},
        {key: np.asarray(column, dtype=float) for key, column in (errors or {}).items()},
    )
    return Region(name, table, template_errors=bool(errors), empty_bin_events=empty_bin_events)


def background(
    name: str, shape: Shape, events: Quantity | None = None, *factors: float | str, region: str = "only"
) -> Process:
    """Return a background in one region."""
    return Process(name, "background", {region: Contribution(shape, events)}, factors)


def signal(
    name: str, shape: Shape, events: Quantity | None = None, *factors: float | str, region: str = "only"
) -> Process:
    """Return a signal in one region."""
    return Process(name, "signal", {region: Contribution(shape, events)}, factors)


def counting(observed: float, expected: float, events: float = 1.0, strength: Prior = WIDE) -> Analysis:
    """Return one bin with a known background and a signal of free strength."""
    return Analysis(
        "Counting",
        (region_of([0.0, 1.0], [observed]),),
        (Parameter("strength", strength),),
        (background("known", Flat(), expected), signal("sought", Flat(), events, "strength")),
    )


def with_observed(analysis: Analysis, observed: Array) -> Analysis:
    """Return an analysis with other counts, all regions' bins in order."""
    regions, start = [], 0
    for region in analysis.regions:
        stop = start + region.table.binning.number
        regions.append(replace(region, table=replace(region.table, observed=observed[start:stop], digest="")))
        start = stop
    return replace(analysis, regions=tuple(regions))


def bump_hunt(observed: Array | None = None, bins: int = 40, *, reach: float = 10.0) -> Analysis:
    """Return a narrow peak of unknown mass and strength on a falling background of uncertain size."""
    return Analysis(
        "Bump hunt",
        (region_of(np.linspace(20.0, 80.0, bins + 1), observed),),
        (
            Parameter("strength", Uniform(0.0, reach)),
            Parameter("mass", Uniform(22.0, 78.0)),
            Parameter("scale", Normal(18.0, 1.0)),
        ),
        (
            background("continuum", Falling("scale"), 1000.0),
            signal("peak", Gaussian("mass", 1.2), 20.0, "strength"),
        ),
        (Uncertainty("continuum size", (Effect("continuum", 0.1),)),),
    )


def seen_bump(strength: float, mass: float) -> Analysis:
    """Return the bump hunt with counts drawn with a peak of this strength at this mass."""
    analysis = bump_hunt()
    model = compile_model(analysis, "signal plus background")
    expected = model.expected(model.natural_seeds(np.array([[strength, mass, 18.0, 0.0]])))[0][0]
    return with_observed(analysis, np.random.default_rng(52).poisson(expected).astype(float))


def everything(*, template_errors: bool = True) -> Analysis:
    """Return an analysis in which every shape, factor, curve, prior and kind of effect has a place."""
    main = np.linspace(1.0, 9.0, 9)
    side = np.array([1.0, 2.0, 4.0, 7.0])
    columns = {
        "soft": [9.0, 8, 7, 5, 4, 3, 2, 1],
        "soft up": [10.0, 9, 7.5, 5, 4, 2.5, 2.2, 1.3],
        "soft down": [8.5, 7, 6.8, 5.2, 4.1, 3, 1.9, 0.8],
        "gappy": [0.0, 2, 0, 3, 1, 0, 4, 1],
        "gappy up": [1.0, 2.5, 0, 2, 0, 0, 5, 1.2],
        "gappy down": [0.0, 1.5, 0, 4, 2, 0, 3, 0.9],
        "light": [6.0, 5, 2, 1, 0.5, 0.3, 0.2, 0.1],
        "middle": [1.0, 3, 6, 4, 2, 1, 0.5, 0.2],
        "heavy": [0.1, 0.3, 0.8, 2, 5, 7, 4, 2],
    }
    errors = {name: 0.1 * np.sqrt(np.asarray(columns[name]) + 0.2) for name in ("soft", "gappy")}
    errors |= {name: 0.15 * np.sqrt(np.asarray(columns[name])) for name in ("light", "middle", "heavy")}
    regions = (
        region_of(
            main, [31.0, 30, 33, 25, 24, 15, 18, 9], columns, errors if template_errors else None, name="main"
        ),
        region_of(side, [25.0, 20, 12], {"soft": [4.0, 3, 2]}, name="side"),
    )
    return Analysis(
        "Everything at once", regions, _parameters(), _processes(), _sources(), (), Exposure(3.0, "d", 0.03)
    )


def _parameters() -> tuple[Parameter, ...]:
    return (
        Parameter("strength", Uniform(0.0, 5.0)),
        Parameter("mass", Uniform(3.0, 6.0)),
        Parameter("rate", Gamma(4.0, 0.2)),
        Parameter("scale", Normal(3.0, 0.4, low=0.5)),
        Parameter("index", LogNormal(1.5, 1.3)),
        Parameter("bend", Beta(2.0, 3.0, 0.2, 2.0)),
        Parameter("resolution", HalfNormal(0.8)),
        Parameter("width", LogUniform(0.1, 2.0)),
        Parameter("share", Exponential(1.0)),
        Parameter("held", Fixed(1.2)),
    )


def _processes() -> tuple[Process, ...]:
    both = Process(
        "falling",
        "background",
        {"main": Contribution(Falling("scale"), (20.0, "rate")), "side": Contribution(Flat(), "rate")},
        (0.05, "held"),
    )
    growing = Curve("mass", (2.0, 4.0, 5.0, 7.0), (5.0, 7.0, 8.0, 8.5))
    wider = Curve("mass", (2.0, 4.0, 7.0), (0.5, 0.7, 1.1))
    return (
        both,
        background("steep", PowerLaw("index"), 15.0, region="main"),
        background("polynomial", Bernstein((1.0, "bend", 0.5)), 12.0, "share", region="side"),
        Process(
            "soft",
            "background",
            {"main": Contribution(Template("soft"), 18.0), "side": Contribution(Template("soft"))},
        ),
        replace(background("gappy", Template("gappy"), region="main"), follows_exposure=False),
        signal("gaussian", Gaussian("mass", wider), growing, "strength", region="main"),
        signal("resonance", BreitWigner("mass", "width"), 4.0, "strength", region="main"),
        signal("smeared", Voigt(4.5, "width", "resolution"), (3.0, "strength"), region="main"),
        signal(
            "tailed", CrystalBall("mass", "resolution", 1.2, 3.0, 1.5, 2.5), 5.0, "strength", region="main"
        ),
        signal(
            "moving",
            Templates("mass", (2.0, 4.5, 7.0), ("light", "middle", "heavy")),
            6.0,
            "strength",
            region="main",
        ),
    )


def _sources() -> tuple[Uncertainty, ...]:
    return (
        Uncertainty("size", (Effect("falling", 0.1), Effect("steep", 0.2, -0.1))),
        Uncertainty("soft size", (Effect("soft", 0.3, -0.1, regions=("side",)), Effect("gappy", 0.15))),
        Uncertainty("soft shape", (Effect("soft", "soft up", "soft down", regions=("main",)),)),
        Uncertainty("gappy shape", (Effect("gappy", "gappy up", "gappy down"),)),
        Uncertainty(
            "yield of all", (Effect("gaussian", 0.05, 0.02), Effect("moving", 0.04)), regions=("main",)
        ),
    )


def one_hypothesis(analysis: Analysis, *processes: str, name: str = "this") -> Analysis:
    """Return the analysis with a single hypothesis made of the named processes."""
    return replace(analysis, hypotheses=(Hypothesis(name, processes),))


def of(found: Fit, name: str) -> Fitted:
    """Return one parameter of a fit by name."""
    return next(one for one in found.fitted if one.name == name)
