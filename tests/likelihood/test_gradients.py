"""Derivatives that are asked for in part: gradients alone, and parameters that hold still."""

from __future__ import annotations

import numpy as np
import pytest

from tests.analyses import everything
from workbench.likelihood.gradients import gradient
from workbench.likelihood.model import compile_model
from workbench.likelihood.objective import StandardObjective

HYPOTHESIS = "signal plus background"


@pytest.mark.parametrize("template_errors", [False, True])
def test_a_gradient_alone_equals_differences_of_values(template_errors: bool) -> None:
    """Central differences with the error of second order taken out (L.F. Richardson 1911)."""
    model = compile_model(everything(template_errors=template_errors), HYPOTHESIS)
    counts = model.observed_for("a test")
    points = np.random.default_rng(21).normal(0.0, 0.7, (3, model.size))
    found = gradient(model, model.seeds(points), counts)
    for point, row in zip(points, found, strict=True):
        slopes = []
        for step in (2e-3, 1e-3):
            shifts = step * np.eye(model.size)
            up, down = (model.ln_likelihood(model.seeds(point + sign * shifts), counts) for sign in (1, -1))
            slopes.append((up - down) / (2.0 * step))
        np.testing.assert_allclose(row, (4.0 * slopes[1] - slopes[0]) / 3.0, rtol=1e-7, atol=1e-7)


def test_the_objective_adds_the_prior_and_takes_any_number_of_points() -> None:
    model = compile_model(everything(), HYPOTHESIS)
    objective, counts = StandardObjective(model), model.observed_for("a test")
    points = np.random.default_rng(22).normal(0.0, 0.7, (5, model.size))
    np.testing.assert_allclose(
        objective.gradient(points, counts), objective.derivatives(points, counts)[1], rtol=1e-9, atol=1e-9
    )


@pytest.mark.parametrize("template_errors", [False, True])
def test_what_holds_still_changes_nothing_for_what_moves(template_errors: bool) -> None:
    model = compile_model(everything(template_errors=template_errors), HYPOTHESIS)
    counts = model.observed_for("a test")
    still = frozenset(int(index) for index in model.signal)
    moving = np.setdiff1d(np.arange(model.size), model.signal)
    points = np.random.default_rng(23).normal(0.0, 0.7, (4, model.size))
    whole = model.derivatives(model.seeds(points), counts)
    part = model.derivatives(model.seeds(points, still), counts)
    block = np.ix_(np.arange(4), moving, moving)
    np.testing.assert_allclose(part[0], whole[0], rtol=1e-12)
    np.testing.assert_allclose(part[1][:, moving], whole[1][:, moving], rtol=1e-9, atol=1e-9)
    np.testing.assert_allclose(part[2][block], whole[2][block], rtol=1e-9, atol=1e-9)
    shapes = [
        i
        for i in still
        if model.coordinates[i].name not in {one.name for one in model.analysis.uncertainties}
    ]
    assert not part[1][:, shapes].any()
    assert whole[1][:, shapes].any()


def test_points_in_a_row_that_share_a_shape_are_worked_out_once_and_alike() -> None:
    """A column of a quadrature: fifteen strengths at each of a few masses."""
    model = compile_model(everything(), HYPOTHESIS)
    points = np.random.default_rng(24).normal(0.0, 0.5, (30, model.size))
    shapes = [index for index in model.signal if not model.coordinates[index].is_strength]
    points[:, shapes] = np.repeat(points[:3, shapes], 10, axis=0)
    together = model.expected(model.seeds(points))[0]
    alone = [model.expected(model.seeds(point[None]))[0][0] for point in points]
    np.testing.assert_allclose(together, alone, rtol=1e-12)
    distinct, times = model.seeds(points).runs(tuple(int(index) for index in shapes))
    assert distinct.x.shape[1] == 3
    assert times is not None
    assert times.tolist() == [10, 10, 10]
