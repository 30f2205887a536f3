"""Curves read between nodes: panels of polynomials, graded strength nodes, and how far they may be off."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest

from workbench.evidence.ratio.panels import ORDER, Panels
from workbench.evidence.ratio.strengths import Strengths, between, doubt_between, larger_beside

Array = npt.NDArray[np.float64]

EVEN = Panels("mass", "GeV", np.linspace(0.0, 12.0, 7))
ANYWHERE = np.random.default_rng(2).uniform(0.0, 12.0, 500)


def graded(offset: float = 2.0, centre: float = 1.5, scale: float = 0.5, high: float = 40.0) -> Strengths:
    one = np.ones(1)
    return Strengths("strength", 0.0, high, offset * one, centre * one, scale * one, 31)


def test_nodes_are_six_a_panel_and_the_last_end() -> None:
    assert EVEN.nodes.size == 6 * ORDER + 1
    assert (np.diff(EVEN.nodes) > 0.0).all()
    assert set(EVEN.edges) <= set(EVEN.nodes)
    np.testing.assert_allclose(EVEN.nodes[:ORDER], 1.0 - np.cos(np.pi * np.arange(ORDER) / ORDER))


def test_a_polynomial_of_the_sixth_degree_is_read_exactly() -> None:
    curve = np.polynomial.Polynomial([1.0, -2.0, 0.5, 0.1, -0.03, 0.004, -0.0001])
    np.testing.assert_allclose(EVEN.between(curve(EVEN.nodes), ANYWHERE), curve(ANYWHERE), atol=1e-10)
    nodes, weights = EVEN.weights(ANYWHERE)
    read = (curve(EVEN.nodes)[nodes] * weights).sum(axis=1)
    np.testing.assert_allclose(read, curve(ANYWHERE), atol=1e-10)


@pytest.mark.parametrize("width", [0.5, 0.7, 1.0])
def test_what_is_said_to_be_left_out_covers_what_is(width: float) -> None:
    """Of a bell of some widths, the narrowest a quarter of a panel."""

    def bell(x: Array) -> Array:
        return np.asarray(np.exp(-0.5 * ((x - 5.3) / width) ** 2))

    said = EVEN.left_out(EVEN.by_panel(bell(EVEN.nodes)))
    panel, _ = EVEN.place(ANYWHERE)
    off = np.abs(EVEN.between(bell(EVEN.nodes), ANYWHERE) - bell(ANYWHERE))
    worst = np.array([off[panel == one].max() for one in range(6)])
    assert (worst <= 3.0 * said + 1e-9).all()
    assert worst.max() > 0.02 * said.max(), "what is said is not out of all proportion"
    assert (worst > 0.05 * said + 1e-9).any(), "the negative control: a twentieth of it is exceeded"


def test_values_of_many_columns_at_once_are_those_of_each() -> None:
    values = np.sin(np.outer(EVEN.nodes, np.linspace(0.1, 1.0, 40)))
    together = EVEN.between(values, ANYWHERE)
    alone = [EVEN.between(values[:, k], ANYWHERE) for k in range(40)]
    np.testing.assert_allclose(together, np.stack(alone, axis=1), atol=1e-13)


def test_a_split_keeps_the_range_and_the_other_nodes() -> None:
    finer = EVEN.split(np.array([2]))
    assert finer.range == EVEN.range
    others = (EVEN.nodes <= 4.0) | (EVEN.nodes >= 6.0)
    assert set(EVEN.nodes[others]) <= set(finer.nodes)
    assert finer.nodes.size == EVEN.nodes.size + ORDER


@pytest.mark.parametrize("offset", [1e-5, 0.1, 2.0, 1e4])
def test_strength_nodes_reach_both_ends_and_their_places_count_them(offset: float) -> None:
    laid = graded(offset)
    nodes = laid.nodes
    assert (nodes[0, 0], nodes[0, -1]) == (0.0, 40.0)
    assert (np.diff(nodes[0]) > 0.0).all()
    np.testing.assert_allclose(laid.place(nodes)[0], np.arange(31), atol=1e-6)


def test_nodes_are_dense_around_the_centre_and_at_the_lower_end() -> None:
    nodes = graded().nodes[0]
    spacing = np.diff(nodes)
    assert spacing[np.searchsorted(nodes, 1.5)] < 0.2 * spacing[-1]
    assert spacing[0] < spacing[np.searchsorted(nodes, 1.5)]


@pytest.mark.parametrize(("count", "background"), [(0.0, 2.0), (9.0, 3.0), (2.0, 0.01), (40.0, 12.0)])
def test_the_logarithm_of_a_poisson_probability_is_read_within_the_doubt(
    count: float, background: float
) -> None:
    peak = max((count - background) / 6.0, 0.0)
    laid = graded(background / 6.0, peak, 1.5 / np.sqrt(6.0), 10.0)

    def curve(s: Array) -> Array:
        return np.asarray(count * np.log1p(6.0 * s / background) - 6.0 * s)

    strengths = laid.refined(9)
    place = laid.place(strengths)
    off = np.abs(between(curve(laid.nodes), place) - curve(strengths))
    doubt = larger_beside(doubt_between(curve(laid.nodes)), place)
    near = curve(strengths) > curve(strengths).max() - 8.0
    assert (off <= 2.0 * doubt + 1e-5)[near].all()
    assert off[near].max() < 0.02
