"""Exact derivatives against differences of values, for an analysis that uses every noun of the contract."""

from __future__ import annotations

import warnings

import numpy as np
import numpy.typing as npt
import pytest

from tests.analyses import everything
from workbench.likelihood.kernel import expand
from workbench.likelihood.model import Model, compile_model
from workbench.likelihood.objective import FitObjective, Objective, StandardObjective, fit_objective

Array = npt.NDArray[np.float64]
HYPOTHESIS = "signal plus background"


def model_of_everything(*, template_errors: bool) -> Model:
    return compile_model(everything(template_errors=template_errors), HYPOTHESIS)


def observed(model: Model) -> Array:
    assert model.observed is not None
    return model.observed


def central(objective: Objective, point: Array, counts: Array, step: float) -> tuple[Array, Array]:
    """Gradient from differences of values, Hessian from differences of exact gradients."""
    size = point.size
    shifts = step * np.eye(size)
    points = np.concatenate([point + shifts, point - shifts])
    values = objective.value(points, counts)
    gradients = objective.derivatives(points, counts)[1]
    return (values[:size] - values[size:]) / (2 * step), (gradients[:size] - gradients[size:]) / (2 * step)


def richardson(objective: Objective, point: Array, counts: Array) -> tuple[Array, Array]:
    """Differences with the errors of second order taken out (L.F. Richardson 1911)."""
    coarse, fine = (central(objective, point, counts, step) for step in (2e-3, 1e-3))
    return (4 * fine[0] - coarse[0]) / 3, (4 * fine[1] - coarse[1]) / 3


@pytest.mark.parametrize("template_errors", [False, True])
def test_exact_derivatives_equal_differences_in_standard_coordinates(template_errors: bool) -> None:
    model = model_of_everything(template_errors=template_errors)
    objective, counts = StandardObjective(model), observed(model)
    for point in np.random.default_rng(11).normal(0.0, 0.8, (6, model.size)):
        _, gradient, hessian = objective.derivatives(point[None], counts)
        by_values, by_gradients = richardson(objective, point, counts)
        np.testing.assert_allclose(gradient[0], by_values, rtol=1e-7, atol=1e-7)
        np.testing.assert_allclose(hessian[0], by_gradients, rtol=1e-7, atol=1e-6)


@pytest.mark.parametrize("template_errors", [False, True])
def test_exact_derivatives_equal_differences_in_the_parameters_themselves(template_errors: bool) -> None:
    model = model_of_everything(template_errors=template_errors)
    objective, counts = fit_objective(model), observed(model)
    assert isinstance(objective, FitObjective)
    for point in model.seeds(np.random.default_rng(12).normal(0.0, 0.5, (4, model.size))).x.T:
        _, gradient, hessian = objective.derivatives(point[None], counts)
        by_values, by_gradients = richardson(objective, point, counts)
        np.testing.assert_allclose(gradient[0], by_values, rtol=1e-6, atol=1e-6)
        np.testing.assert_allclose(hessian[0], by_gradients, rtol=1e-6, atol=1e-5)


@pytest.mark.parametrize("template_errors", [False, True])
def test_a_hessian_is_symmetric(template_errors: bool) -> None:
    model = model_of_everything(template_errors=template_errors)
    points = np.random.default_rng(13).normal(size=(5, model.size))
    hessian = model.derivatives(model.seeds(points), observed(model))[2]
    np.testing.assert_allclose(hessian, np.swapaxes(hessian, 1, 2), rtol=1e-11, atol=1e-11)


def test_responses_are_the_first_derivatives_of_the_expected_events() -> None:
    model = model_of_everything(template_errors=True)
    point, step = np.random.default_rng(14).normal(0.0, 0.5, model.size), 1e-4
    shifts = step * np.eye(model.size)
    up, down = (model.expected(model.seeds(point + sign * shifts))[0] for sign in (1.0, -1.0))
    responses = model.responses(model.seeds(point[None]))[0]
    np.testing.assert_allclose(responses, (up - down) / (2 * step), rtol=1e-6, atol=1e-6)


@pytest.mark.parametrize("template_errors", [False, True])
def test_a_batch_equals_its_points_one_at_a_time(template_errors: bool) -> None:
    model = model_of_everything(template_errors=template_errors)
    generator = np.random.default_rng(15)
    points = generator.normal(size=(7, model.size))
    counts = generator.poisson(20.0, (7, model.bins)).astype(float)
    whole = model.derivatives(model.seeds(points), counts)
    values = model.ln_likelihood(model.seeds(points), counts)
    for row in range(7):
        seeds = model.seeds(points[row][None])
        alone = model.derivatives(seeds, counts[row])
        for together, single in zip(whole, alone, strict=True):
            np.testing.assert_allclose(together[row], single[0], rtol=1e-10, atol=1e-10)
        np.testing.assert_allclose(values[row], model.ln_likelihood(seeds, counts[row])[0], rtol=1e-12)
    np.testing.assert_allclose(values, whole[0], rtol=1e-12)


def test_expected_events_and_expansion_agree_and_processes_add_up() -> None:
    model = model_of_everything(template_errors=True)
    points = np.random.default_rng(16).normal(size=(3, model.size))
    seeds = model.seeds(points)
    total, variance = model.expected(seeds)
    events, errors = expand(model.parts, model.overall, model.size, seeds)
    assert variance is not None
    assert errors is not None
    sums, squares = np.zeros_like(total), np.zeros_like(total)
    for piece in events.pieces:
        sums[:, piece.bins] += piece.events
    for piece in errors.pieces:
        squares[:, piece.bins] += piece.events**2
    np.testing.assert_allclose(sums, total, rtol=1e-13)
    np.testing.assert_allclose(squares, variance, rtol=1e-13)
    np.testing.assert_allclose(sum(model.by_process(seeds).values()), total, rtol=1e-13)


@pytest.mark.parametrize("template_errors", [False, True])
def test_far_out_in_the_priors_values_fall_and_derivatives_stay_finite(template_errors: bool) -> None:
    """Counts where nothing is expected once gave a Hessian of nan and warnings of overflow."""
    model = model_of_everything(template_errors=template_errors)
    generator = np.random.default_rng(17)
    points = np.clip(generator.normal(0.0, 8.0, (300, model.size)), -20.0, 20.0)
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        value, gradient, hessian = model.derivatives(model.seeds(points), observed(model))
        plain = model.ln_likelihood(model.seeds(points), observed(model))
    assert not np.isnan(value).any()
    assert np.isfinite(gradient).all()
    assert np.isfinite(hessian).all()
    np.testing.assert_allclose(value, plain, rtol=1e-9)
