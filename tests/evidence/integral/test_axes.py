"""Where nodes along a mass stand: no resolution element without two of them, no narrow line missed."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest
from scipy import special

from tests.evidence.small_analyses import bump
from workbench.evidence.integral.axes import (
    GAUSS_WEIGHTS,
    KRONROD_NODES,
    KRONROD_WEIGHTS,
    Axis,
    lay_out,
    standard,
)
from workbench.evidence.integral.quadrature import integrate
from workbench.evidence.integral.search import survey
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.priors import LogUniform, Normal, Prior, Uniform
from workbench.likelihood.model import Model, compile_model

Array = npt.NDArray[np.float64]

FULL_WIDTH = 2.0 * np.sqrt(2.0 * np.log(2.0))  # at half maximum, in standard deviations


def compiled(analysis: Analysis) -> Model:
    return compile_model(analysis, "signal plus background")


def background(bins: int) -> Array:
    """Return the expected continuum of the bump analysis."""
    edges = np.linspace(0.0, 20.0, bins + 1)
    return np.asarray(400.0 * -np.diff(np.exp(-edges / 8.0)) / -np.expm1(-20.0 / 8.0))


def nodes_in_mass(bins: int, resolution: float, mass: Prior) -> Array:
    counts = np.random.default_rng(2).poisson(background(bins)).astype(float)
    model = compiled(bump(counts, bins=bins, resolution=resolution, mass=mass))
    axis = model.names.index("mass")
    return mass.quantile(lay_out(model, survey(model, counts, {}), axis, (axis,)).nodes)


@pytest.mark.parametrize(
    "mass",
    [Uniform(1.0, 19.0), LogUniform(1.0, 19.0), Normal(10.0, 3.0, low=1.0, high=19.0)],
    ids=lambda prior: prior.family,
)
@pytest.mark.parametrize(
    ("resolution", "bins"), [(1.5, 40), (0.4, 100), (0.4, 40), (0.05, 400), (0.02, 1000)]
)
def test_no_resolution_element_is_without_two_nodes(resolution: float, bins: int, mass: Prior) -> None:
    """An element is the full width at half maximum of the peak as the bins see it."""
    x = nodes_in_mass(bins, resolution, mass)
    seen = np.hypot(resolution, 20.0 / bins / np.sqrt(12.0))
    ends = np.concatenate([[1.0], x, [19.0]])
    assert (ends[2:] - ends[:-2]).max() < FULL_WIDTH * seen
    assert seen / np.diff(x).mean() > 1.5


def test_fewer_nodes_stand_where_a_resolution_grows() -> None:
    """The axis follows what the counts can tell apart: half the resolution, twice the nodes."""
    fine, coarse = (nodes_in_mass(200, sd, Uniform(1.0, 19.0)).size for sd in (0.25, 0.5))
    assert 1.6 < fine / coarse < 2.4


@pytest.mark.parametrize("mass", [1.15, 7.77, 12.345, 18.9])
def test_a_narrow_line_is_never_missed(mass: float) -> None:
    """A line of 1/200 of the range, far from every hint: its column is the highest, and it is resolved."""
    edges = np.linspace(0.0, 20.0, 251)
    line = 40.0 * np.diff(special.ndtr((edges - mass) / 0.09))
    counts = np.round(0.5 * background(250) + line)
    model = compiled(bump(counts, bins=250, resolution=0.09))
    grid = integrate(model, counts)
    assert grid is not None
    heights = grid.columns.ln_integral()
    x = Uniform(1.0, 19.0).quantile(grid.axes[0].nodes)
    assert abs(x[int(np.argmax(heights))] - mass) < 0.09
    assert (np.abs(x - mass) < 0.12).sum() >= 3


def test_the_rules_integrate_polynomials_exactly() -> None:
    """Three Gauss points are exact to degree 5, seven Kronrod points to degree 11, on one set of nodes."""
    for degree, weights in ((5, GAUSS_WEIGHTS), (11, KRONROD_WEIGHTS)):
        for power in range(degree + 1):
            exact = 0.0 if power % 2 else 2.0 / (power + 1.0)
            assert weights @ KRONROD_NODES**power == pytest.approx(exact, abs=1e-13)
        assert abs(weights @ KRONROD_NODES ** (degree + 1) - 2.0 / (degree + 2.0)) > 1e-5


def test_weights_of_an_axis_add_up_to_all_of_the_prior() -> None:
    axis = Axis(np.array([0.0, 0.1, 0.4, 1.0]))
    assert axis.weights.sum() == pytest.approx(1.0, abs=1e-14)
    assert axis.coarse_weights.sum() == pytest.approx(1.0, abs=1e-14)
    assert (np.diff(axis.nodes) > 0.0).all()
    assert axis.weights @ axis.nodes**3 == pytest.approx(0.25, abs=1e-14)


def test_splitting_a_panel_leaves_the_others_alone() -> None:
    axis = Axis(np.array([0.0, 0.2, 0.6, 1.0]))
    assert axis.split(np.array([1])).edges == pytest.approx([0.0, 0.2, 0.4, 0.6, 1.0], abs=1e-15)


def test_prior_probabilities_and_standard_coordinates_agree() -> None:
    p = np.array([0.0, 1e-200, 1e-12, 0.3, 0.5, 1.0 - 1e-12, 1.0])
    t = standard(p)
    assert np.isfinite(t).all()
    assert special.ndtr(t[1:-1]) == pytest.approx(p[1:-1], rel=1e-9)
