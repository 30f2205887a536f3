"""Small analyses that tests build in Python; all of them invented."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
import numpy.typing as npt

from workbench.counts.binning import Binning
from workbench.counts.region import Region
from workbench.counts.table import Table
from workbench.hypotheses.analysis import Analysis, Parameter
from workbench.hypotheses.priors import Exponential, Prior, Uniform
from workbench.hypotheses.processes import Contribution, Process
from workbench.hypotheses.shapes import Falling, Flat, Gaussian, Template
from workbench.hypotheses.uncertainties import Effect, Uncertainty

Array = npt.NDArray[np.float64]

YIELD = 6.0  # events that a signal of strength 1 adds to a counting analysis
TAU = 4.0  # exposure of its control region in units of the other's


def one_bin(name: str, observed: float | None, **columns: float) -> Region:
    """Return a region of a single bin from 0 to 1, with templates by name."""
    counted = None if observed is None else np.array([float(observed)])
    given = {column: np.array([value]) for column, value in columns.items()}
    return Region(name, Table(Binning(np.array([0.0]), np.array([1.0])), counted, given))


def evenly(low: float, high: float, number: int) -> Binning:
    """Return bins of equal width."""
    edges = np.linspace(low, high, number + 1)
    return Binning(edges[:-1], edges[1:])


def several_bins(
    name: str,
    observed: Sequence[float] | Array,
    columns: Mapping[str, Sequence[float]] | None = None,
    errors: Mapping[str, Sequence[float]] | None = None,
    *,
    template_errors: bool = False,
    empty_bin_events: float | None = None,
) -> Region:
    """Return a region of unit bins from 0 up, with templates and perhaps their errors."""
    given = {k: np.array(v, dtype=float) for k, v in (columns or {}).items()}
    spread = {k: np.array(v, dtype=float) for k, v in (errors or {}).items()}
    counted = np.array(observed, dtype=float)
    table = Table(evenly(0.0, float(counted.size), counted.size), counted, given, spread)
    return Region(name, table, template_errors=template_errors, empty_bin_events=empty_bin_events)


def source(name: str, **effects: float | tuple[float, float]) -> Uncertainty:
    """Return a source of uncertainty: process=one number, or process=(up, down)."""
    made = [
        Effect(process, *size) if isinstance(size, tuple) else Effect(process, size)
        for process, size in effects.items()
    ]
    return Uncertainty(name, tuple(made))


def counting(
    observed: float,
    background: float | Prior,
    strength: Prior,
    control: float | None = None,
    uncertainties: tuple[Uncertainty, ...] = (),
) -> Analysis:
    """Return one count: its background known or with a prior, a signal, and perhaps a control region."""
    parameters = [Parameter("strength", strength)]
    level: tuple[float | str, ...] = ("level",)
    if isinstance(background, int | float):
        level = (float(background),)
    else:
        parameters.append(Parameter("level", background))
    into = {"on": Contribution(Flat(), 1.0)}
    regions = [one_bin("on", observed)]
    if control is not None:
        regions.append(one_bin("off", control))
        into["off"] = Contribution(Flat(), TAU)
    return Analysis(
        title="Counting",
        regions=tuple(regions),
        parameters=tuple(parameters),
        processes=(
            Process("background", "background", into, factors=level),
            Process("signal", "signal", {"on": Contribution(Flat(), YIELD)}, factors=("strength",)),
        ),
        uncertainties=uncertainties,
    )


def templates(
    region: Region,
    strength: Prior | None = None,
    uncertainties: tuple[Uncertainty, ...] = (),
) -> Analysis:
    """Return a region whose columns are processes: "signal" has a strength, the others are backgrounds."""
    names = [name for name in region.table.columns if not name.endswith((" up", " down"))]
    return Analysis(
        title="Templates",
        regions=(region,),
        parameters=(Parameter("strength", strength or Exponential(1.0)),),
        processes=tuple(
            Process(
                name,
                "signal" if name == "signal" else "background",
                {region.name: Contribution(Template(name))},
                factors=("strength",) if name == "signal" else (),
            )
            for name in names
        ),
        uncertainties=uncertainties,
    )


def bump(
    observed: Array | None = None,
    *,
    bins: int = 40,
    resolution: float = 0.4,
    events: float = 12.0,
    continuum: float = 400.0,
    strength: Prior | None = None,
    mass: Prior | None = None,
    uncertainties: tuple[Uncertainty, ...] = (),
) -> Analysis:
    """Return a narrow peak of unknown mass on a falling continuum from 0 to 20."""
    table = Table(evenly(0.0, 20.0, bins), observed)
    return Analysis(
        title="Bump",
        regions=(Region("spectrum", table),),
        parameters=(
            Parameter("strength", strength or Uniform(0.0, 5.0)),
            Parameter("mass", mass or Uniform(1.0, 19.0)),
        ),
        processes=(
            Process("continuum", "background", {"spectrum": Contribution(Falling(8.0), continuum)}),
            Process(
                "peak",
                "signal",
                {"spectrum": Contribution(Gaussian("mass", resolution), events)},
                factors=("strength",),
            ),
        ),
        uncertainties=uncertainties,
    )
