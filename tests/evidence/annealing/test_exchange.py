"""What may be exchanged, mirrored, or moved together, read off the hypothesis."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from tests.evidence.resonances import resonances
from tests.evidence.small_analyses import bump, counting, source
from workbench.evidence.annealing.exchange import (
    blocks,
    groups,
    interchangeable,
    involutions,
    like_signal_cautions,
    like_signals,
)
from workbench.hypotheses.priors import Exponential, Gamma, Uniform
from workbench.hypotheses.processes import Contribution
from workbench.hypotheses.shapes import Gaussian
from workbench.likelihood.model import compile_model

COUNTS = np.full(40, 8.0)


def test_signals_with_coordinates_of_their_own_are_alike() -> None:
    model = compile_model(resonances(COUNTS, 3), "3 resonances")
    places = {name: index for index, name in enumerate(model.names)}
    pairs = like_signals(model)
    assert len(pairs) == 3
    assert pairs[0] == (
        [places["strength 1"], places["mass 1"]],
        [places["strength 2"], places["mass 2"]],
    )
    assert like_signals(compile_model(resonances(COUNTS, 3), "1 resonance")) == []


def test_an_exchange_leaves_the_likelihood_of_like_signals_alone() -> None:
    model = compile_model(resonances(COUNTS, 2), "2 resonances")
    maps = involutions(model)
    points = np.random.default_rng(3).standard_normal((50, model.size))
    exchanged = maps.applied(points, np.zeros(50))
    assert (exchanged != points).sum() == 4 * 50
    before, after = (model.ln_likelihood(model.seeds(one), COUNTS) for one in (points, exchanged))
    np.testing.assert_allclose(after, before, rtol=1e-12)


def test_signals_are_said_to_be_alike_only_where_their_exchange_changes_nothing() -> None:
    analysis = resonances(COUNTS, 2)
    assert interchangeable(compile_model(analysis, "2 resonances")) == [("peak 1", "peak 2")]
    assert interchangeable(compile_model(analysis, "1 resonance")) == []
    assert interchangeable(compile_model(analysis, "none")) == []
    narrower = replace(analysis.parameter("mass 2"), prior=Uniform(1.0, 10.0))
    parameters = tuple(narrower if one.name == "mass 2" else one for one in analysis.parameters)
    assert interchangeable(compile_model(replace(analysis, parameters=parameters), "2 resonances")) == []
    wider = Contribution(Gaussian("mass 2", 0.9), 20.0)
    other = replace(analysis.process("peak 2"), regions={"spectrum": wider})
    processes = tuple(other if one.name == "peak 2" else one for one in analysis.processes)
    assert interchangeable(compile_model(replace(analysis, processes=processes), "2 resonances")) == []
    (caution,) = like_signal_cautions(compile_model(analysis, "2 resonances"))
    assert caution.code == "like-signals"
    assert '"peak 1" and "peak 2" are alike' in caution.text


def test_every_map_is_its_own_inverse_and_keeps_the_prior() -> None:
    for name in ("none", "2 resonances", "3 resonances"):
        model = compile_model(resonances(COUNTS, 3), name)
        maps = involutions(model)
        for which in (np.arange(len(maps.orders)) + 0.5) / len(maps.orders):
            points = np.random.default_rng(5).standard_normal((4, model.size))
            once = maps.applied(points, np.full(4, which))
            assert (once != points).any()
            np.testing.assert_array_equal(maps.applied(once, np.full(4, which)), points)
            np.testing.assert_allclose((once**2).sum(axis=1), (points**2).sum(axis=1))


def test_a_signal_moves_as_a_whole_and_its_mass_alone() -> None:
    sources = (source("size", continuum=0.1),)
    model = compile_model(bump(COUNTS, uncertainties=sources), "signal plus background")
    assert model.names == ("strength", "mass", "size")
    assert blocks(model).tolist() == [[True, True, False], [False, True, False]]
    assert [group.tolist() for group in groups(model)] == [[0, 1], [0, 1, 2]]


def test_without_a_signal_every_coordinate_moves_alone() -> None:
    model = compile_model(counting(3, Gamma(2.0, 1.0), Exponential(1.0)), "background only")
    assert blocks(model).tolist() == [[True]]
    assert groups(model) == ()
