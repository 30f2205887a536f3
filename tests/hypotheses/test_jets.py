"""Jets against differences of sixth order, and by hand."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import numpy.typing as npt
import pytest

from workbench.hypotheses.jets import Jet, choose, compose, matched

Array = npt.NDArray[np.float64]

X = np.array([0.4, 1.1, 2.3])
Y = np.array([1.7, 0.3, 0.9])


def pair(x: Array, y: Array) -> tuple[Jet, Jet]:
    """Return x and y as the variables 0 and 1."""
    one, zero = np.ones(x.shape), np.zeros(x.shape)
    return Jet.variable(x, one, zero, 0, 2), Jet.variable(y, one, zero, 1, 2)


def slope_of(function: Callable[[Array], Array], x: Array, step: float = 3e-3) -> Array:
    """Return the derivative by the central difference of sixth order."""
    parts = [function(x + k * step) - function(x - k * step) for k in (1, 2, 3)]
    return np.asarray((45.0 * parts[0] - 9.0 * parts[1] + parts[2]) / (60.0 * step))


FORMULAS: dict[str, Callable[[Jet, Jet], Jet]] = {
    "product": lambda x, y: x * y * x,
    "quotient": lambda x, y: (x + 2.0) / (y * y + 1.0),
    "reciprocal": lambda x, y: 3.0 / (x + y),
    "difference": lambda x, y: 1.0 - x * y - (y - 2.0) * 4.0,
    "exponential": lambda x, y: (x * y).exp(),
    "exponential less 1": lambda x, y: (x * y * -0.5).expm1(),
    "logarithm": lambda x, y: (x + y * y).log() * x,
    "arc tangent": lambda x, y: (x * x - y).arctan(),
    "normal": lambda x, y: (x - y / x).normal_cdf(),
}


@pytest.mark.parametrize("formula", FORMULAS.values(), ids=FORMULAS)
def test_derivatives_are_those_of_the_value(formula: Callable[[Jet, Jet], Jet]) -> None:
    jet = formula(*pair(X, Y))
    np.testing.assert_allclose(
        jet.first[0], slope_of(lambda x: formula(*pair(x, Y)).value, X), rtol=1e-8, atol=1e-9
    )
    np.testing.assert_allclose(
        jet.first[1], slope_of(lambda y: formula(*pair(X, y)).value, Y), rtol=1e-8, atol=1e-9
    )
    by_x = slope_of(lambda x: formula(*pair(x, Y)).first[0], X)
    by_y = slope_of(lambda y: formula(*pair(X, y)).first[1], Y)
    crossed = slope_of(lambda y: formula(*pair(X, y)).first[0], Y)
    np.testing.assert_allclose(jet.second[0, 0], by_x, rtol=1e-7, atol=1e-8)
    np.testing.assert_allclose(jet.second[1, 1], by_y, rtol=1e-7, atol=1e-8)
    np.testing.assert_allclose(jet.second[0, 1], crossed, rtol=1e-7, atol=1e-8)
    np.testing.assert_array_equal(jet.second[0, 1], jet.second[1, 0])


def test_a_product_worked_by_hand() -> None:
    """f = x^2 y at (3, 5): f = 45, gradient (30, 9), second derivatives 10, 6, 0."""
    x, y = pair(np.array(3.0), np.array(5.0))
    jet = x * x * y
    assert float(jet.value) == 45.0
    assert jet.first.tolist() == [30.0, 9.0]
    assert jet.second.tolist() == [[10.0, 6.0], [6.0, 0.0]]


def test_a_coordinate_behind_the_variable_counts_too() -> None:
    """x = t^3 at t = 2 and f = x^2 = t^6: f' = 6 t^5 = 192, f'' = 30 t^4 = 480."""
    x = Jet.variable(np.array(8.0), np.array(12.0), np.array(12.0), 0, 1)
    jet = x * x
    assert (float(jet.first[0]), float(jet.second[0, 0])) == (192.0, 480.0)


def test_without_variables_only_values_are_made() -> None:
    jet = (Jet.constant(X) * Jet.constant(Y) + 1.0).log().exp()
    np.testing.assert_allclose(jet.value, X * Y + 1.0)
    assert (jet.variables, jet.first.size, jet.second.size) == (0, 0, 0)


@pytest.mark.parametrize(
    "combine", [lambda a, b: a + b, lambda a, b: a * b, lambda a, b: a - b, lambda a, b: b / a]
)
def test_a_lone_number_meets_a_batch_with_bins(combine: Callable[[Jet, Jet], Jet]) -> None:
    """A constant's two derivative axes once stood where the batch of the other began."""
    x = pair(X, Y)[0].over_bins() * np.array([1.0, 2.0, 3.0, 4.0])
    plain = combine(x, x * 0.0 + 2.5)
    for constant in (Jet.constant(2.5, 2), Jet.constant(2.5), Jet.constant(np.full(4, 2.5), 2)):
        jet = combine(x, constant).spread(3, 4)
        np.testing.assert_allclose(jet.value, plain.value)
        np.testing.assert_allclose(jet.first, plain.first)
        np.testing.assert_allclose(jet.second, plain.second)


def test_an_array_times_a_jet_is_a_jet() -> None:
    x, _ = pair(X, Y)
    left, right = np.array([1.0, 2.0]) * x.over_bins(), x.over_bins() * np.array([1.0, 2.0])
    assert isinstance(left, Jet)
    np.testing.assert_array_equal(left.first, right.first)


def test_a_constant_does_not_move_and_a_variable_does() -> None:
    x, _ = pair(X, Y)
    assert (x.moves, x.is_constant) == (True, False)
    assert (Jet.constant(X, 2).moves, Jet.constant(X, 2).is_constant) == (False, True)
    assert Jet.constant(X).is_constant


def test_numbers_of_variables_that_differ_are_refused() -> None:
    with pytest.raises(ValueError, match="2 variables meets one of 3"):
        matched(Jet.constant(1.0, 2), Jet.constant(1.0, 3))


def test_choosing_takes_value_and_derivatives_from_the_same_side() -> None:
    x, _ = pair(X, Y)
    jet = choose(X > 1.0, x * x, Jet.constant(7.0, 2))
    np.testing.assert_allclose(jet.value, [7.0, 1.1**2, 2.3**2])
    np.testing.assert_allclose(jet.first[0], [0.0, 2.2, 4.6])
    assert not jet.first[1].any()


def test_composing_follows_the_chain_rule() -> None:
    """f_i(u, v) = sin(u b_i) exp(v), with u = x y and v = x / y, against the same written with jets."""
    bins = np.array([0.5, 1.0, 2.0])
    x, y = pair(X, Y)
    u, v = x * y, x / y
    phase = u.value[:, None] * bins
    wave, slow, grow = np.sin(phase), np.cos(phase), np.exp(v.value[:, None])
    slopes = (bins * slow * grow, wave * grow)
    bends = {(0, 0): -(bins**2) * wave * grow, (0, 1): bins * slow * grow, (1, 1): wave * grow}
    jet = compose(wave * grow, (u, v), lambda k: slopes[k], lambda k, m: bends[k, m])
    scaled = u.over_bins() * bins
    written = (
        scaled.apply(np.sin(scaled.value), np.cos(scaled.value), -np.sin(scaled.value)) * v.over_bins().exp()
    )
    np.testing.assert_allclose(jet.value, written.value)
    np.testing.assert_allclose(jet.first, written.first)
    np.testing.assert_allclose(jet.second, written.second)


def test_composing_asks_for_no_derivative_of_what_stands_still() -> None:
    asked: list[int] = []

    def slope(k: int) -> Array:
        asked.append(k)
        return np.ones((3, 2))

    x, _ = pair(X, Y)
    compose(np.ones((3, 2)), (Jet.constant(1.0, 2), x), slope, lambda k, m: np.zeros((3, 2)))
    assert asked == [1]
    still = compose(
        np.ones((3, 2)), (Jet.constant(1.0), Jet.constant(X)), slope, lambda k, m: np.zeros((3, 2))
    )
    assert (asked, still.variables) == ([1], 0)
