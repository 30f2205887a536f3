"""Random analyses of few bins: single counts, control regions of few events, one-sided sources."""

from __future__ import annotations

import numpy as np

from tests.evidence.references.ingredients import (
    Draft,
    Rng,
    between,
    factor_size,
    level_prior,
    number,
    planned,
    random_sources,
    strength_prior,
    yield_and_strength,
)
from workbench.hypotheses.analysis import Analysis, Parameter
from workbench.hypotheses.priors import (
    Exponential,
    Fixed,
    Gamma,
    HalfNormal,
    LogNormal,
    LogUniform,
    Prior,
    Uniform,
)
from workbench.hypotheses.processes import Contribution, Process
from workbench.hypotheses.shapes import Flat, Shape, Template
from workbench.hypotheses.uncertainties import Effect, Uncertainty

EDGES = np.array([0.0, 1.0])
FLAT: Shape = Flat()


def single_counts(rng: Rng) -> Draft:
    """Return one bin: background known or not, strength known or not, up to three sources."""
    level = between(rng, 0.3, 2000.0)
    events, strength = yield_and_strength(rng, np.ones(1), np.array([level]))
    is_known = rng.random() < 0.4
    prior = Fixed(1.0) if is_known else strength_prior(rng)
    parameters = [Parameter("strength", prior)]
    factors: tuple[float | str, ...] = (level,)
    if rng.random() < 0.6:
        parameters.append(Parameter("level", level_prior(rng, level, between(rng, 0.05, 0.8))))
        factors = ("level",)
    kinds = ("background", "signal")
    return Draft(
        Analysis(
            "A single count",
            (planned("on", EDGES, {}),),
            tuple(parameters),
            (
                Process(kinds[0], "background", {"on": Contribution(FLAT, 1.0)}, factors),
                Process(kinds[1], "signal", {"on": Contribution(FLAT, events)}, ("strength",)),
            ),
            random_sources(rng, int(rng.integers(0, 4)), kinds),
        ),
        {"strength": strength},
        beside={"on": np.array([rng.choice([1.0, 1.0, 0.8, 1.2])])},
    )


def few_off_counts(rng: Rng) -> Draft:
    """Return a signal region whose backgrounds are told by control regions with 0 to 4 events each."""
    total = int(rng.integers(1, 5))
    names = [f"off {place + 1}" for place in range(total)]
    off = rng.integers(0, 5, size=total).astype(float)
    transfers = [between(rng, 0.1, 2.0) for _ in names]
    expected = sum(t * (n + 1.0) for t, n in zip(transfers, off, strict=True))
    events, strength = yield_and_strength(rng, np.ones(1), np.array([expected]))
    parameters = [Parameter("strength", strength_prior(rng))]
    processes = [Process("signal", "signal", {"on": Contribution(FLAT, events)}, ("strength",))]
    sources = []
    for name, transfer in zip(names, transfers, strict=True):
        parameters.append(Parameter(f"level {name}", _wide(rng)))
        into = {"on": Contribution(FLAT, transfer), name: Contribution(FLAT, 1.0)}
        processes.append(Process(f"from {name}", "background", into, (f"level {name}",)))
        if rng.random() < 0.5:
            effect = Effect(f"from {name}", *factor_size(rng, 0.6), regions=("on",))
            sources.append(Uncertainty(f"transfer {name}", (effect,)))
    signal = random_sources(rng, int(rng.integers(0, 2)), ["signal"])
    return Draft(
        Analysis(
            "Control regions with few events",
            (planned("on", EDGES, {}), *(planned(name, EDGES, {}) for name in names)),
            tuple(parameters),
            tuple(processes),
            (*sources, *signal),
        ),
        {"strength": strength},
        forced={name: off[place : place + 1] for place, name in enumerate(names)},
    )


def _wide(rng: Rng) -> Prior:
    families: tuple[Prior, ...] = (
        Uniform(0.0, 20.0),
        Exponential(4.0),
        Gamma(number(rng, 0.5, 2.0), 0.3),
        LogUniform(0.05, 20.0),
        LogNormal(2.0, number(rng, 2.0, 4.0)),
        HalfNormal(5.0),
    )
    return families[rng.integers(len(families))]


def one_sided_sources(rng: Rng) -> Draft:
    """Return sources that raise (or lower) a background whichever way they go, with counts to ask for it."""
    size = int(rng.integers(1, 8))
    level = between(rng, 50.0, 800.0)
    part = rng.dirichlet(np.full(size, 5.0))
    bump = rng.dirichlet(np.full(size, 1.0)) + 0.01
    events, strength = yield_and_strength(rng, bump, level * part)
    columns = {"background": np.round(level * part, 6), "signal": np.round(events * bump / bump.sum(), 6)}
    total = int(rng.integers(1, 4))
    sources = []
    for place in range(total):
        up = between(rng, 0.15, 0.5) * (1.0 if rng.random() < 0.75 else -0.6)
        down = up * number(rng, 0.6, 1.0)
        sources.append(Uncertainty(f"one-sided {place + 1}", (Effect("background", up, down),)))
    more = random_sources(rng, int(rng.integers(0, 4)), ["background", "signal"], 0.1)
    return Draft(
        Analysis(
            "Sources that bend to one side",
            (planned("only", np.arange(size + 1.0), columns),),
            (Parameter("strength", strength_prior(rng)),),
            (
                Process("background", "background", {"only": Contribution(Template("background"))}),
                Process("signal", "signal", {"only": Contribution(Template("signal"))}, ("strength",)),
            ),
            (*sources, *more),
        ),
        {"strength": strength},
        beside={"only": np.full(size, number(rng, 0.85, 1.35))},
    )
