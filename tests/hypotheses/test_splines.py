"""The monotone cubic and quantities made of it, against scipy's own evaluation and by hand."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.interpolate import PchipInterpolator

from workbench.hypotheses.jets import Jet
from workbench.hypotheses.quantities import Curve, evaluate, parameters_of
from workbench.hypotheses.splines import Spline

AT = np.array([20.0, 30.0, 45.0, 50.0, 80.0])
VALUES = np.array([1.0, 1.3, 2.8, 2.9, 2.0])
BY_BIN = np.random.default_rng(7).gamma(3.0, size=(5, 4))
X = np.array([[20.0, 24.0, 30.0], [47.0, 79.0, 80.0]])


@pytest.mark.parametrize("values", [VALUES, BY_BIN], ids=["one number", "bin by bin"])
def test_values_and_derivatives_are_scipys(values: np.ndarray) -> None:
    reference = PchipInterpolator(AT, values, axis=0)
    got = Spline(AT, values)(X)
    for order, part in enumerate(got):
        inside = X.ravel() < 80.0 if order == 2 else np.full(6, True)
        flat = part.reshape(6, *values.shape[1:])[inside]
        np.testing.assert_allclose(flat, reference(X.ravel()[inside], nu=order), rtol=1e-12, atol=1e-13)
    np.testing.assert_array_equal(Spline(AT, values).value(X), got.value)


def test_it_passes_through_its_points_and_never_beyond_its_neighbours() -> None:
    spline = Spline(AT, VALUES)
    np.testing.assert_allclose(spline.value(AT), VALUES, rtol=1e-15)
    for low, high, first, last in zip(AT[:-1], AT[1:], VALUES[:-1], VALUES[1:], strict=True):
        between = spline.value(np.linspace(low, high, 101))
        assert between.min() >= min(first, last) - 1e-12
        assert between.max() <= max(first, last) + 1e-12


def test_two_points_make_a_line() -> None:
    value, first, second = Spline([0.0, 2.0], [1.0, 5.0])(0.5)
    assert (float(value), float(first), float(second)) == (2.0, 2.0, 0.0)


def test_along_a_jet_the_chain_rule_holds() -> None:
    """x = t^2 at t = 6: df/dt = 12 f', d2f/dt2 = 144 f'' + 2 f'."""
    x = Jet.variable(np.array([36.0]), np.array([12.0]), np.array([2.0]), 0, 1)
    value, first, second = Spline(AT, BY_BIN)(np.array([36.0]))
    jet = Spline(AT, BY_BIN).along(x)
    assert jet.value.shape == (1, 4)
    np.testing.assert_allclose(jet.value, value)
    np.testing.assert_allclose(jet.first[0], 12.0 * first)
    np.testing.assert_allclose(jet.second[0, 0], 144.0 * second + 2.0 * first)


def test_along_a_constant_there_are_values_only() -> None:
    jet = Spline(AT, BY_BIN).along(Jet.constant(np.array([36.0, 40.0]), 3))
    assert (jet.value.shape, jet.variables, jet.moves) == ((2, 4), 3, False)


CURVE = Curve("mass", (20.0, 30.0, 80.0), (1.0, 1.5, 3.0))


def test_a_quantity_names_its_parameters_once() -> None:
    assert parameters_of(3.0) == ()
    assert parameters_of("mass") == ("mass",)
    assert parameters_of(("strength", 2.0, CURVE, "mass", "strength")) == ("strength", "mass")


def test_a_quantity_is_the_product_of_its_factors() -> None:
    """2 x strength x curve(mass): the slope in strength is what is left without it."""
    mass = Jet.variable(np.array([25.0, 60.0]), np.ones(2), np.zeros(2), 0, 2)
    strength = Jet.variable(np.array([0.5, 3.0]), np.ones(2), np.zeros(2), 1, 2)
    jet = evaluate((2.0, "strength", CURVE), {"mass": mass, "strength": strength})
    curve = PchipInterpolator(CURVE.at, CURVE.values)
    np.testing.assert_allclose(jet.value, 2.0 * strength.value * curve(mass.value))
    np.testing.assert_allclose(jet.first[1], 2.0 * curve(mass.value))
    np.testing.assert_allclose(jet.first[0], 2.0 * strength.value * curve(mass.value, nu=1))
    np.testing.assert_allclose(jet.second[0, 1], 2.0 * curve(mass.value, nu=1))
    np.testing.assert_allclose(jet.second[0, 0], 2.0 * strength.value * curve(mass.value, nu=2), atol=1e-15)


def test_a_number_has_as_many_variables_as_the_parameters() -> None:
    mass = Jet.variable(np.array([25.0]), np.ones(1), np.zeros(1), 0, 2)
    assert evaluate(3.0, {"mass": mass}).variables == 2
    assert evaluate(3.0, {}).variables == 0
    assert float(evaluate((), {}).value) == 1.0
