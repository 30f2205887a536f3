"""Batched Newton steps: they end where the gradient does, inside the box, whatever the curvature."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy import optimize

from tests.analyses import bump_hunt, counting, everything
from workbench.likelihood.model import compile_model
from workbench.likelihood.newton import maximise, solve_definite
from workbench.likelihood.objective import StandardObjective, fit_objective

Array = npt.NDArray[np.float64]


@dataclass(frozen=True)
class Bowl:
    """-(x - centre).M.(x - centre)/2 in a box; the counts are not used."""

    matrix: Array
    centre: Array
    low: Array
    high: Array

    def value(self, points: Array, counts: Array) -> Array:
        away = points - self.centre
        return np.asarray(-0.5 * np.einsum("na,ab,nb->n", away, self.matrix, away))

    def derivatives(self, points: Array, counts: Array) -> tuple[Array, Array, Array]:
        away = points - self.centre
        hessian = np.repeat(-self.matrix[None], len(points), axis=0)
        return self.value(points, counts), -away @ self.matrix, hessian


@dataclass(frozen=True)
class Wells:
    """-(x^2 - 1)^2: two maxima with a minimum between, where the curvature has the wrong sign."""

    low: Array
    high: Array

    def value(self, points: Array, counts: Array) -> Array:
        return np.asarray(-((points[:, 0] ** 2 - 1.0) ** 2))

    def derivatives(self, points: Array, counts: Array) -> tuple[Array, Array, Array]:
        x = points[:, 0]
        return (
            self.value(points, counts),
            (-4.0 * x * (x * x - 1.0))[:, None],
            (-12.0 * x * x + 4.0)[:, None, None],
        )


NO_COUNTS = np.zeros(1)
FREE = np.array([np.inf, np.inf])
M = np.array([[2.0, 0.9], [0.9, 1.0]])


def test_a_parabola_takes_one_step() -> None:
    bowl = Bowl(M, np.array([1.5, -0.5]), -FREE, FREE)
    found = maximise(bowl, np.array([[0.0, 0.0], [3.0, 1.0]]), NO_COUNTS, most=1)
    np.testing.assert_allclose(found.points, np.repeat(bowl.centre[None], 2, axis=0), atol=1e-12)
    assert found.converged.all()


def test_going_on_takes_the_last_promised_step_without_a_look() -> None:
    """On a parabola the promise is kept: the step ends at the maximum."""
    bowl = Bowl(M, np.array([0.5, -0.5]), -FREE, FREE)
    start = np.array([[0.0, 0.0]])
    there = maximise(bowl, start, NO_COUNTS, tolerance=1.0)
    beyond = maximise(bowl, start, NO_COUNTS, tolerance=1.0, go_on=True)
    np.testing.assert_array_equal(there.points, start)
    np.testing.assert_allclose(beyond.points, bowl.centre[None], atol=1e-12)
    assert beyond.evaluations == 1
    np.testing.assert_allclose(beyond.values + beyond.gains, [0.0], atol=1e-12)


def test_a_maximum_outside_the_box_is_met_at_its_edge() -> None:
    """By hand: at x = 1 the best y is where 0.9 (1 - 3) + (y - 0) = 0, so 1.8."""
    bowl = Bowl(M, np.array([3.0, 0.0]), np.array([-1.0, -9.0]), np.array([1.0, 9.0]))
    found = maximise(bowl, np.zeros((1, 2)), NO_COUNTS)
    np.testing.assert_allclose(found.points[0], [1.0, 1.8], atol=1e-6)
    assert found.converged[0]


def test_what_does_not_move_stays_for_all_rows_or_for_each() -> None:
    bowl = Bowl(M, np.array([1.0, 2.0]), -FREE, FREE)
    start = np.array([[0.0, 0.0], [0.0, 0.0]])
    all_rows = maximise(bowl, start, NO_COUNTS, moving=np.array([False, True]))
    np.testing.assert_allclose(all_rows.points, [[0.0, 2.9], [0.0, 2.9]], atol=1e-6)
    each = maximise(bowl, start, NO_COUNTS, moving=np.array([[False, True], [True, False]]))
    np.testing.assert_allclose(each.points, [[0.0, 2.9], [1.9, 0.0]], atol=1e-6)
    assert each.converged.all()


def test_wrong_curvature_leads_away_from_a_minimum() -> None:
    wells = Wells(np.array([-np.inf]), np.array([np.inf]))
    found = maximise(wells, np.array([[0.05], [-0.3], [2.0]]), NO_COUNTS)
    np.testing.assert_allclose(found.points[:, 0], [1.0, -1.0, 1.0], atol=1e-4)
    assert found.converged.all()


def test_an_impossible_point_is_not_called_converged() -> None:
    """A start where the counts are impossible has no slope to follow: it once counted as converged."""
    model = compile_model(counting(3.0, 0.0), "signal plus background")
    objective = fit_objective(model)
    assert model.observed is not None
    stuck = maximise(objective, np.zeros((1, 1)), model.observed, moving=np.array([False]))
    assert stuck.values[0] == -np.inf
    assert not stuck.converged[0]


def test_maxima_agree_with_scipy() -> None:
    """scipy.optimize.minimize (L-BFGS-B with values only) as an independent route."""
    model = compile_model(everything(), "signal plus background")
    objective, counts = StandardObjective(model), model.observed
    assert counts is not None
    found = maximise(objective, np.zeros((1, model.size)), counts)
    best = optimize.minimize(
        lambda x: -float(objective.value(x[None], counts)[0]),
        np.zeros(model.size),
        jac=lambda x: -objective.derivatives(x[None], counts)[1][0],
        method="BFGS",
        options={"gtol": 1e-7},
    )
    assert found.converged[0]
    assert found.values[0] >= -best.fun - 1e-7
    np.testing.assert_allclose(found.points[0], best.x, atol=2e-3)


def test_a_batch_ends_where_each_row_ends_alone() -> None:
    model = compile_model(bump_hunt(np.zeros(40)), "background only")
    objective = fit_objective(model)
    generator = np.random.default_rng(31)
    counts = generator.poisson(30.0, (20, 40)).astype(float)
    start = np.repeat([[18.0, 0.0]], 20, axis=0)
    together = maximise(objective, start, counts)
    assert together.converged.all()
    for row in range(0, 20, 5):
        alone = maximise(objective, start[:1], counts[row])
        np.testing.assert_allclose(together.points[row], alone.points[0], atol=1e-6)
    np.testing.assert_allclose(together.gradients, 0.0, atol=1e-2)


def test_definite_systems_are_solved_and_indefinite_ones_made_definite() -> None:
    right = np.array([[1.0, 2.0], [1.0, 2.0]])
    definite = np.repeat(M[None], 2, axis=0)
    np.testing.assert_allclose(solve_definite(definite, right, np.ones(2))[0], np.linalg.solve(M, right[0]))
    indefinite = np.array([[[2.0, 0.0], [0.0, -4.0]], [[2.0, 0.0], [0.0, 0.0]]])
    found = solve_definite(indefinite, right, np.ones(2))
    np.testing.assert_allclose(found[0], [0.5, 0.5])
    assert np.isfinite(found).all()
    assert (np.einsum("na,na->n", found, right) > 0.0).all()
