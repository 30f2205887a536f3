"""Densities that are linear between nodes: their draws follow them."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest
from scipy import integrate, stats

from workbench.evidence.integral.piecewise import between, draw, hat_areas

Array = npt.NDArray[np.float64]

NODES = np.array([0.0, 0.1, 0.35, 0.4, 0.9, 1.0])
HEIGHTS = np.array([1.0, 0.0, 3.0, 3.0, 0.5, 2.0])


def distribution(x: Array, nodes: Array = NODES, heights: Array = HEIGHTS) -> Array:
    """Return the distribution function, by the trapezoidal rule on a fine grid: an independent route."""
    fine = np.union1d(np.linspace(nodes[0], nodes[-1], 20_001), nodes)
    upto = integrate.cumulative_trapezoid(np.interp(fine, nodes, heights), fine, initial=0.0)
    return np.asarray(np.interp(x, fine, upto / upto[-1]))


def test_a_triangle_by_hand() -> None:
    """Density 2 x on [0, 1]: the distribution function is x^2, so that u = 1/4 is drawn at 1/2."""
    x = draw(np.array([0.0, 1.0]), np.array([0.0, 7.0]), np.array([0.25, 0.81]))
    assert x == pytest.approx([0.5, 0.9], abs=1e-12)


def test_a_draw_is_where_the_distribution_function_equals_the_uniform_number() -> None:
    u = np.linspace(0.001, 0.999, 499)
    assert distribution(draw(NODES, HEIGHTS, u)) == pytest.approx(u, abs=1e-6)


def test_draws_follow_the_density() -> None:
    """Kolmogorov's distance of 20,000 draws: passed by chance once in ten thousand times."""
    uniform = np.random.default_rng(12).random(20_000)
    assert stats.kstest(draw(NODES, HEIGHTS, uniform), distribution).pvalue > 1e-4


def test_draws_of_another_density_are_seen() -> None:
    """The negative control: one height a fifth higher."""
    uniform = np.random.default_rng(12).random(20_000)
    other = HEIGHTS * np.array([1.0, 1.0, 1.2, 1.0, 1.0, 1.0])
    assert stats.kstest(draw(NODES, other, uniform), distribution).pvalue < 1e-4


def test_every_draw_may_have_its_own_density() -> None:
    u = np.array([0.3, 0.3])
    nodes = np.array([[0.0, 1.0, 2.0], [5.0, 5.5, 6.0]])
    heights = np.array([[0.0, 1.0, 0.0], [2.0, 1.0, 1.0]])
    each = [draw(nodes[i], heights[i], u[i : i + 1])[0] for i in (0, 1)]
    assert draw(nodes, heights, u) == pytest.approx(each, abs=1e-14)


def test_nothing_is_drawn_where_the_density_is_zero() -> None:
    nodes, heights = np.array([0.0, 1.0, 2.0, 3.0, 4.0]), np.array([1.0, 0.0, 0.0, 1.0, 1.0])
    x = draw(nodes, heights, np.random.default_rng(1).random(5000))
    assert not ((x > 1.0 + 1e-9) & (x < 2.0 - 1e-9)).any()


def test_values_between_nodes_by_hand() -> None:
    below, share = between(np.array([0.0, 1.0, 3.0]), np.array([-2.0, 0.0, 0.25, 1.0, 2.5, 3.0, 9.0]))
    assert below.tolist() == [0, 0, 0, 1, 1, 1, 1]
    assert share == pytest.approx([0.0, 0.0, 0.25, 0.0, 0.75, 1.0, 1.0])


def test_a_single_node_has_everything() -> None:
    below, share = between(np.array([0.5]), np.array([0.1, 0.9]))
    assert below.tolist() == [0, 0]
    assert share.tolist() == [0.0, 0.0]


def test_hat_areas_integrate_what_is_linear_between_nodes_and_flat_beyond() -> None:
    """By hand: nodes 0.2 and 0.6 with heights 1 and 3: 0.2 + 0.4 x 2 + 0.4 x 3 = 2.2."""
    assert hat_areas(np.array([0.2, 0.6])) @ np.array([1.0, 3.0]) == pytest.approx(2.2, abs=1e-14)
    inner = NODES[1:-1]
    heights = np.array([0.3, 2.0, 1.0, 0.7])
    fine = np.linspace(0.0, 1.0, 200_001)
    exact = integrate.trapezoid(np.interp(fine, inner, heights), fine)
    assert hat_areas(inner) @ heights == pytest.approx(exact, abs=1e-8)
    assert hat_areas(inner).sum() == pytest.approx(1.0, abs=1e-14)
