"""The integrand at nodes: Laplace by hand, columns that hold all of it, and which coordinate is which."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import numpy.typing as npt
import pytest

from tests.evidence.small_analyses import bump, counting, several_bins, source, templates
from workbench.evidence.integral.nodes import INNER_NODES, Columns, Integrand, laplace
from workbench.evidence.integral.search import survey
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.priors import Exponential, HalfNormal, Prior, Uniform
from workbench.likelihood.model import compile_model

Array = npt.NDArray[np.float64]


def integrand_of(analysis: Analysis, hypothesis: str = "signal plus background") -> Integrand:
    model = compile_model(analysis, hypothesis)
    assert model.observed is not None
    return Integrand(model, model.observed, survey(model, model.observed, {}))


def names(integrand: Integrand, indices: tuple[int, ...]) -> list[str]:
    return [integrand.model.names[index] for index in indices]


def test_laplace_by_hand() -> None:
    """-H = [[2, 1], [1, 3]], determinant 5: ln 2 pi - ln(5)/2; of the second alone ln(2 pi/3)/2."""
    hessians = -np.array([[[2.0, 1.0], [1.0, 3.0]]])
    assert laplace(hessians) == pytest.approx([np.log(2.0 * np.pi) - 0.5 * np.log(5.0)], rel=1e-13)
    assert laplace(hessians[:, 1:, 1:]) == pytest.approx([0.5 * np.log(2.0 * np.pi / 3.0)], rel=1e-13)
    assert laplace(hessians[:, :0, :0]) == pytest.approx([0.0])


def test_laplace_of_what_is_no_maximum_is_not_a_number() -> None:
    with np.errstate(invalid="ignore"):
        assert np.isnan(laplace(-np.diag([1.0, -2.0])[None]))[0]


def column(inner: Array, ln_height: Array) -> Columns:
    shape = inner.shape
    return Columns(
        np.zeros((len(inner), 0)),
        inner,
        ln_height,
        np.zeros((*shape, 1)),
        np.zeros((*shape, 1, 1)),
        np.ones(shape, dtype=bool),
        True,
    )


def test_a_column_of_a_gaussian_is_its_integral() -> None:
    """Evenly spaced nodes integrate a bell to machine precision; every second one tells the error."""
    t = np.linspace(-7.0, 7.0, 15)[None]
    bell = column(t, -0.5 * (t / 1.5) ** 2 + 300.0)
    exact = 300.0 + 0.5 * np.log(2.0 * np.pi * 1.5**2)
    assert bell.ln_integral() == pytest.approx([exact], abs=2e-5)
    assert bell.inner_error()[0] < 1e-3
    cut = column(t + 6.0, -0.5 * ((t + 6.0) / 1.5) ** 2)
    assert cut.inner_error()[0] > 0.5, "an integrand that is cut off has an error of its own size"


def test_the_last_strength_is_the_inner_coordinate_and_the_mass_an_outer_one() -> None:
    integrand = integrand_of(bump(np.ones(40), uncertainties=(source("size", continuum=0.1),)))
    assert integrand.inner is not None
    assert names(integrand, (integrand.inner,)) == ["strength"]
    assert names(integrand, integrand.outer) == ["mass"]
    assert names(integrand, tuple(integrand.nuisance)) == ["size"]


def test_a_background_alone_has_nuisance_coordinates_only() -> None:
    analysis = bump(np.ones(40), uncertainties=(source("size", continuum=0.1),))
    integrand = integrand_of(analysis, "background only")
    assert (integrand.inner, integrand.outer) == (None, ())
    columns = integrand.columns(np.zeros((1, 0)))
    assert columns.ln_height.shape == (1, 1)
    assert not columns.has_inner


@pytest.mark.parametrize(
    "strength", [Uniform(0.0, 5.0), Exponential(1.0), HalfNormal(3.0), Uniform(0.0, 1e4)]
)
@pytest.mark.parametrize(("n", "b"), [(0, 3.0), (5, 10.0), (60, 10.0), (10_300, 10_000.0)])
def test_a_column_holds_all_of_the_integrand(n: int, b: float, strength: Prior) -> None:
    """At its ends the integrand is down to a hundredth, or the prior ends; enough nodes are near the top."""
    columns = integrand_of(counting(n, b, strength)).columns(np.zeros((1, 0)))
    assert columns.inner.shape == (1, INNER_NODES)
    assert columns.converged.all()
    depth = columns.ln_height.max() - columns.ln_height[0]
    t = columns.inner[0]
    assert depth[0] > 4.5 or t[0] < -8.0
    assert depth[-1] > 4.5 or t[-1] > 8.0
    assert (depth < 4.5).sum() >= 4


def test_nuisance_coordinates_are_at_their_maximum_at_every_node() -> None:
    """A little to either side the integrand is lower: values only, no derivatives."""
    region = several_bins(
        "r", [14.0, 22.0, 9.0], {"background": [10.0, 15.0, 8.0], "signal": [1.0, 6.0, 2.0]}
    )
    integrand = integrand_of(templates(region, Exponential(1.0), (source("size", background=0.3),)))
    columns = integrand.columns(np.zeros((1, 0)))
    model, counts = integrand.model, integrand.counts

    def height(points: Array) -> Array:
        prior = -0.5 * (points**2).sum(axis=1)
        return np.asarray(model.ln_likelihood(model.seeds(points), counts) + prior)

    points = columns.points[0]
    aside = np.zeros(model.size)
    aside[integrand.nuisance] = 0.1
    top = height(points)
    assert (height(points + aside) < top).all()
    assert (height(points - aside) < top).all()


def test_columns_are_taken_and_joined_row_by_row() -> None:
    integrand = integrand_of(bump(np.ones(40)))
    first, second = (integrand.columns(np.array([[t]])) for t in (-0.5, 0.7))
    both = first.joined(second)
    assert both.take(np.array([1, 0])).ln_height == pytest.approx(
        np.concatenate([second.ln_height, first.ln_height]), abs=0.0
    )
    assert both.ln_integral() == pytest.approx(
        integrand.columns(np.array([[-0.5], [0.7]])).ln_integral(), abs=1e-9
    )
    assert both.evaluations == first.evaluations + second.evaluations >= 2 * INNER_NODES


def test_nodes_on_which_newtons_steps_crawl_are_no_longer_refined() -> None:
    """A million counts in a bin that expects seven once kept the mass-unknown Skerry busy for minutes."""
    integrand = integrand_of(bump(np.ones(40)))
    usual = integrand.columns(np.array([[0.0]]))
    assert not integrand.is_beyond_reach(usual)
    assert not integrand.is_beyond_reach(replace(usual, evaluations=100 * usual.inner.size))
    assert integrand.is_beyond_reach(replace(usual, evaluations=10**9))
