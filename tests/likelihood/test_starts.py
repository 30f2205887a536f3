"""Starting points: a bump is found wherever it is, in every pseudo-experiment at once."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from tests.analyses import bump_hunt, counting, everything
from workbench.likelihood.model import Model, compile_model
from workbench.likelihood.newton import maximise
from workbench.likelihood.starts import best_points, searcher

Array = npt.NDArray[np.float64]
HYPOTHESIS = "signal plus background"


def toys(model: Model, masses: Array, strength: float) -> Array:
    points = np.stack(
        [np.full(masses.size, strength), masses, np.full(masses.size, 18.0), np.zeros(masses.size)], 1
    )
    expected = model.expected(model.natural_seeds(points))[0]
    return np.random.default_rng(41).poisson(expected).astype(float)


def test_a_bump_at_any_mass_is_found_from_every_toy() -> None:
    """No toy ends lower than from a start at the true mass; with 140 events in the peak it ends there."""
    model = compile_model(bump_hunt(), HYPOTHESIS)
    search = searcher(model)
    masses = np.linspace(23.0, 77.0, 150)
    for strength, is_clear in ((3.0, False), (7.0, True)):
        counts = toys(model, masses, strength)
        points, values, converged = best_points(search, counts)
        told = np.stack([np.full(150, strength), masses, np.full(150, 18.0), np.zeros(150)], axis=1)
        cheat = maximise(search.objective, told, counts, scale=search.scale)
        assert converged.all()
        assert (cheat.values - values).max() < 1e-4
        if is_clear:  # the mass sd is 1.2/sqrt(140) x sqrt(1 + 2 x 250/140), 0.22, over the densest continuum
            assert np.abs(points[:, 1] - masses).max() < 5 * 0.22


def test_no_finer_grid_of_starts_finds_a_higher_point() -> None:
    """Brute force: a start at every resolution, for toys without signal, whose surface has many hills."""
    model = compile_model(bump_hunt(), HYPOTHESIS)
    search = searcher(model)
    counts = toys(model, np.full(40, 50.0), 0.0)
    _, values, _ = best_points(search, counts)
    best = np.full(40, -np.inf)
    for mass in np.arange(22.5, 78.0, 1.2):
        start = np.repeat([[0.5, mass, 18.0, 0.0]], 40, axis=0)
        best = np.maximum(best, maximise(search.objective, start, counts, scale=search.scale).values)
    assert (best - values).max() < 1e-4


def test_each_row_of_counts_has_its_own_starts_inside_the_range() -> None:
    model = compile_model(bump_hunt(), HYPOTHESIS)
    search = searcher(model)
    counts = toys(model, np.array([30.0, 60.0]), 5.0)
    starts, owners = search.starts(counts)
    assert sorted(set(owners.tolist())) == [0, 1]
    assert (starts >= search.objective.low).all()
    assert (starts <= search.objective.high).all()
    for row, mass in enumerate((30.0, 60.0)):
        assert np.abs(starts[owners == row, 1] - mass).min() < 1.0


def test_without_signal_parameters_there_is_one_start_a_row() -> None:
    model = compile_model(bump_hunt(), "background only")
    starts, owners = searcher(model).starts(np.full((3, 40), 20.0))
    assert owners.tolist() == [0, 1, 2]
    assert starts.shape == (3, 2)


def test_without_parameters_the_best_point_is_the_only_one() -> None:
    model = compile_model(counting(3.0, 2.0), "background only")
    points, values, converged = best_points(searcher(model), np.array([[3.0], [0.0]]))
    assert points.shape == (2, 0)
    assert converged.all()
    # By hand: ln P(3; 2) = 3 ln 2 - 2 - ln 6 and ln P(0; 2) = -2.
    np.testing.assert_allclose(values, [3 * np.log(2) - 2 - np.log(6), -2.0])


def test_a_strength_alone_is_found_by_hand() -> None:
    """n = 12, b = 4, s = 2: strength (12 - 4)/2 = 4; n = 1: at its end, 0."""
    model = compile_model(counting(12.0, 4.0, 2.0), HYPOTHESIS)
    points, _, converged = best_points(searcher(model), np.array([[12.0], [1.0]]), tolerance=1e-10)
    assert converged.all()
    np.testing.assert_allclose(points[:, 0], [4.0, 0.0], atol=1e-4)


def test_every_kind_of_analysis_has_starts() -> None:
    model = compile_model(everything(), HYPOTHESIS)
    assert model.observed is not None
    _, values, converged = best_points(searcher(model), model.observed[None])
    assert np.isfinite(values).all()
    assert converged.all()
