"""Random analyses of templates: many sources, several regions, small simulations, twins."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from tests.evidence.references.ingredients import (
    UNIT,
    Draft,
    Rng,
    between,
    bins,
    bump_template,
    events_of,
    level_prior,
    number,
    planned,
    random_sources,
    significance,
    smooth_template,
    strength_prior,
)
from workbench.hypotheses.analysis import Analysis, Exposure, Parameter
from workbench.hypotheses.priors import Uniform
from workbench.hypotheses.processes import Contribution, Process
from workbench.hypotheses.quantities import Curve
from workbench.hypotheses.shapes import Template, Templates
from workbench.hypotheses.uncertainties import Effect, Uncertainty

Array = npt.NDArray[np.float64]
Columns = dict[str, Array]


def _regions(rng: Rng, backgrounds: list[str], total: int, size: int) -> tuple[dict[str, Columns], float]:
    """Return each region's columns, the signal scaled to its unit, and the strength in the counts."""
    found: dict[str, Columns] = {}
    names = [f"region {place + 1}" for place in range(total)]
    for name in names:
        level = between(rng, 3.0 * size**0.5, 100.0 * size)
        own = max(1, round(size * rng.uniform(0.3, 1.0))) if name != names[0] else size
        share = rng.dirichlet(np.full(len(backgrounds), 2.0))
        found[name] = {
            background: smooth_template(rng, own, float(level * part))
            for background, part in zip(backgrounds, share, strict=True)
        }
        # The last of several regions is a control region with hardly any signal.
        reach = 0.02 if name == names[-1] and total > 1 else 1.0
        found[name]["signal"] = reach * bump_template(rng, own) * float(np.sqrt(level))
    under = np.concatenate([sum(columns[b] for b in backgrounds) for columns in found.values()])
    signal = np.concatenate([columns["signal"] for columns in found.values()])
    unit = events_of(signal, under, UNIT) / signal.sum()
    for columns in found.values():
        columns["signal"] = np.round(columns["signal"] * unit, 9) + 1e-9
    return found, events_of(signal, under, significance(rng)) / (unit * signal.sum())


def _edges(size: int) -> Array:
    return np.arange(size + 1.0)


def _process(name: str, found: dict[str, Columns], *factors: float | str) -> Process:
    into = {region: Contribution(Template(name)) for region in found}
    return Process(name, "signal" if name == "signal" else "background", into, factors)


def _shape_sources(rng: Rng, found: dict[str, Columns], total: int) -> tuple[Uncertainty, ...]:
    """Return sources that tilt or bend a background's template, their columns added to each region."""
    sources = []
    backgrounds = [name for name in next(iter(found.values())) if name != "signal"]
    for place in range(total):
        name = backgrounds[rng.integers(len(backgrounds))]
        up, down = f"{name} up {place + 1}", f"{name} down {place + 1}"
        for columns in found.values():
            size = columns[name].size
            x = np.linspace(-1.0, 1.0, size) if size > 1 else np.ones(1)
            ln_ratio = between(rng, 0.02, 0.3) * (rng.normal() * x + rng.normal() * (x * x - 0.3))
            columns[up] = np.round(columns[name] * np.exp(ln_ratio), 9) + 1e-9
            columns[down] = np.round(columns[name] * np.exp(-number(rng, 0.4, 1.2) * ln_ratio), 9) + 1e-9
        sources.append(Uncertainty(f"shape {place + 1}", (Effect(name, up, down),)))
    return tuple(sources)


def _analysis(
    title: str,
    found: dict[str, Columns],
    parameters: list[Parameter],
    processes: list[Process],
    sources: tuple[Uncertainty, ...],
    errors: dict[str, Columns] | None = None,
) -> Analysis:
    regions = tuple(
        planned(name, _edges(columns["signal"].size), columns, (errors or {}).get(name))
        for name, columns in found.items()
    )
    return Analysis(title, regions, tuple(parameters), tuple(processes), sources)


def many_sources(rng: Rng) -> Draft:
    """Return up to 29 sources on up to 200 bins in up to 3 regions."""
    backgrounds = ["first", "second", "third"][: int(rng.integers(1, 4))]
    size = bins(rng, 1, 200)
    total = int(rng.integers(1, 4)) if size < 100 else 1
    found, strength = _regions(rng, backgrounds, total, max(size // total, 1))
    wanted = 29 if rng.random() < 0.1 else int(rng.integers(3, 30))
    bent = int(rng.integers(0, min(wanted, 5)))
    sources = (
        *_shape_sources(rng, found, bent),
        *random_sources(rng, wanted - bent, [*backgrounds, "signal"], 0.25),
    )
    processes = [*(_process(name, found) for name in backgrounds), _process("signal", found, "strength")]
    parameters = [Parameter("strength", strength_prior(rng))]
    return Draft(_analysis("Many sources", found, parameters, processes, sources), {"strength": strength})


def small_simulations(rng: Rng) -> Draft:
    """Return templates whose own statistics matter, in one or two regions."""
    backgrounds = ["first", "second"][: int(rng.integers(1, 3))]
    size = bins(rng, 1, 60)
    found, strength = _regions(rng, backgrounds, int(rng.integers(1, 3)), size)
    relative = between(rng, 0.03, 0.5)
    errors = {
        region: {name: relative * np.sqrt(column * column.mean()) for name, column in columns.items()}
        for region, columns in found.items()
    }
    if rng.random() < 0.3:
        errors = {region: {backgrounds[0]: columns[backgrounds[0]]} for region, columns in errors.items()}
    bent = _shape_sources(rng, found, int(rng.integers(0, 2)))
    sources = (*bent, *random_sources(rng, int(rng.integers(0, 6)), [*backgrounds, "signal"]))
    processes = [*(_process(name, found) for name in backgrounds), _process("signal", found, "strength")]
    parameters = [Parameter("strength", strength_prior(rng))]
    return Draft(
        _analysis("Small simulations", found, parameters, processes, sources, errors), {"strength": strength}
    )


def deficits(rng: Rng) -> Draft:
    """Return counts below the background, so that the strength is pressed against 0."""
    backgrounds = ["first", "second"][: int(rng.integers(1, 3))]
    size = bins(rng, 1, 50)
    found, _ = _regions(rng, backgrounds, 1, size)
    columns = found["region 1"]
    under = np.asarray(sum(columns[name] for name in backgrounds))
    depth = number(rng, 0.5, 4.0)  # standard deviations of the counts, where the signal would be
    lacking = depth * np.sqrt(under) * columns["signal"] / np.sqrt((columns["signal"] ** 2).sum())
    sources = random_sources(rng, int(rng.integers(0, 7)), [*backgrounds, "signal"], 0.15)
    processes = [*(_process(name, found) for name in backgrounds), _process("signal", found, "strength")]
    parameters = [Parameter("strength", strength_prior(rng))]
    return Draft(
        _analysis("A deficit", found, parameters, processes, sources),
        {"strength": 0.0},
        beside={"region 1": np.maximum(1.0 - lacking / under, 0.02)},
    )


def twins(rng: Rng) -> Draft:
    """Return backgrounds of one shape and free sizes, sources of one effect, and sources of none."""
    size = bins(rng, 1, 40)
    found, strength = _regions(rng, ["first"], 1, size)
    columns = found["region 1"]
    columns["second"] = number(rng, 0.3, 2.0) * columns["first"]
    columns["faint"] = 1e-3 * smooth_template(rng, size, 1.0)
    names = ["strength", "first size", "second size", "both"]
    spreads = [between(rng, 0.1, 0.8) for _ in names]
    parameters = [Parameter("strength", strength_prior(rng))]
    parameters += [
        Parameter(name, level_prior(rng, 1.0, spread))
        for name, spread in zip(names[1:], spreads[1:], strict=True)
    ]
    processes = [
        _process("first", found, "first size", "both"),
        _process("second", found, "second size", "both"),
        _process("faint", found),
        _process("signal", found, "strength"),
    ]
    size_effect = between(rng, 0.05, 0.4)
    sources = (
        *(Uncertainty(f"same {i}", (Effect("first", size_effect),)) for i in range(int(rng.integers(0, 3)))),
        *(Uncertainty(f"faint {i}", (Effect("faint", 0.5, -0.5),)) for i in range(int(rng.integers(0, 4)))),
        *random_sources(rng, int(rng.integers(0, 4)), ["signal"]),
    )
    return Draft(_analysis("Twins", found, parameters, processes, sources), {"strength": strength})


def moving_templates(rng: Rng) -> Draft:
    """Return a signal whose template, yield and efficiency follow the mass, beside a control region."""
    size = bins(rng, 8, 60)
    found, _ = _regions(rng, ["first", "second"], 2, size)
    columns = found["region 1"]
    at = (100.0, 130.0, 160.0, 200.0, 250.0)
    x = (np.arange(size) + 0.5) / size
    under = columns["first"] + columns["second"]
    shapes = [np.exp(-0.5 * ((x - (m - 80.0) / 200.0) / 0.09) ** 2) + 1e-6 for m in at]
    unit = float(f"{events_of(shapes[2], under, UNIT):.4g}")
    names = tuple(f"mass {m:g}" for m in at)
    columns |= {name: np.round(shape, 9) for name, shape in zip(names, shapes, strict=True)}
    values = tuple(float(f"{unit * number(rng, 0.7, 1.4):.4g}") for _ in at)
    moving = Contribution(Templates("mass", at, names), Curve("mass", at, values))
    signal = Process("signal", "signal", {"region 1": moving}, ("strength",))
    sources = random_sources(rng, int(rng.integers(0, 5)), ["first", "second", "signal"])
    exposure = Exposure(10.0, "d", between(rng, 0.01, 0.1)) if rng.random() < 0.5 else None
    parameters = [
        Parameter("strength", strength_prior(rng)),
        Parameter("mass", Uniform(100.0, 250.0)),
    ]
    backgrounds = [_process("first", found), _process("second", found)]
    made = _analysis("A template that moves", found, parameters, [*backgrounds, signal], sources)
    sigmas, mass = significance(rng), number(rng, 105.0, 240.0)
    truth = {"strength": events_of(shapes[2], under, sigmas) / unit, "mass": mass}
    analysis = Analysis(
        made.title, made.regions, made.parameters, made.processes, made.uncertainties, (), exposure
    )
    return Draft(analysis, truth)
