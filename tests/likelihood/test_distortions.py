"""Smooth distortions in the likelihood: their functions, what they multiply, and exact derivatives."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy import integrate, special

import workbench as wb
from tests.analyses import background, bump_hunt, everything, region_of
from workbench.hypotheses.shapes import Template
from workbench.likelihood.distortions import smooth_functions
from workbench.likelihood.fit import fit
from workbench.likelihood.model import compile_model

NEITHER = "signal plus background"


def distorted(analysis: wb.Analysis, distortion: wb.Distortion) -> wb.Analysis:
    """Return the analysis with its last hypothesis distorted."""
    *rest, last = analysis.hypotheses
    return replace(analysis, hypotheses=(*rest, replace(last, distortion=distortion)))


def test_three_terms_over_two_equal_bins_and_over_one_by_hand() -> None:
    """Means over half of [-1, 1]: of 1: 1; of sqrt(3) x: sqrt(3)/2; of sqrt(5) (3 x^2 - 1)/2: 0."""
    assert smooth_functions(np.array([7.0, 7.0]), 3) == pytest.approx(
        np.array([[1.0, 1.0], [-0.5 * np.sqrt(3.0), 0.5 * np.sqrt(3.0)], [0.0, 0.0]]), abs=1e-14
    )
    assert smooth_functions(np.array([3.0]), 2) == pytest.approx(np.array([[1.0], [0.0]]), abs=1e-14)


def test_each_bin_holds_the_mean_of_the_polynomial_over_its_share() -> None:
    """The mean over the bin by scipy's adaptive quadrature of scipy's own Legendre polynomials."""
    events = np.array([50.0, 0.0, 3.0, 20.0, 1e-3, 27.0])
    edges = np.concatenate([[0.0], np.cumsum(events)]) / events.sum()
    found = smooth_functions(events, 6)
    for term in range(6):
        for place in np.flatnonzero(events):
            low, high = edges[place], edges[place + 1]
            whole, _ = integrate.quad(lambda u, k=term: special.eval_legendre(k, 2.0 * u - 1.0), low, high)
            wanted = np.sqrt(2.0 * term + 1.0) * whole / (high - low)
            assert found[term, place] == pytest.approx(wanted, abs=1e-9)


def test_terms_are_orthonormal_over_the_background_of_fine_bins_and_bounded_over_any() -> None:
    edges = np.linspace(0.0, 8.0, 401)
    events = 1e4 * -np.diff(np.exp(-edges))
    functions = smooth_functions(events, 4)
    products = (functions * events) @ functions.T / events.sum()
    assert products == pytest.approx(np.eye(4), abs=3e-3)
    uneven = smooth_functions(np.array([1e6, 1.0, 1e-9]), 3)
    assert (np.abs(uneven) <= np.sqrt(2.0 * np.arange(3) + 1.0)[:, None] + 1e-12).all()


def test_backgrounds_are_multiplied_by_what_the_term_says_and_the_signal_is_not() -> None:
    analysis = distorted(bump_hunt(), wb.Distortion(0.2, 2))
    model, plain = compile_model(analysis, NEITHER), compile_model(bump_hunt(), NEITHER)
    names = ("distortion 1 in only", "distortion 2 in only")
    assert model.names == (*plain.names, *names)
    point = np.array([[0.4, -0.3, 0.7, 0.2, 1.0, -0.5]])
    nominal = compile_model(bump_hunt(), "background only")
    functions = smooth_functions(nominal.expected(nominal.seeds(np.zeros((1, nominal.size))))[0][0], 2)
    factor = 1.2 ** (1.0 * functions[0] - 0.5 * functions[1])
    before, after = plain.by_process(plain.seeds(point[:, :4])), model.by_process(model.seeds(point))
    assert after["peak"] == pytest.approx(before["peak"], rel=1e-14)
    assert after["continuum"] == pytest.approx(factor * before["continuum"], rel=1e-12)


def test_the_other_hypotheses_are_as_they_were() -> None:
    analysis = distorted(bump_hunt(), wb.Distortion(0.2, 2))
    model, plain = (compile_model(one, "background only") for one in (analysis, bump_hunt()))
    point = np.array([[0.7, 0.2]])
    assert (model.expected(model.seeds(point))[0] == plain.expected(plain.seeds(point))[0]).all()
    assert model.names == plain.names


@pytest.mark.parametrize("template_errors", [False, True])
def test_derivatives_with_a_distortion_are_those_of_differences(template_errors: bool) -> None:
    """Central differences of the ln likelihood itself, with every kind of source and shape beside it."""
    plain = everything(template_errors=template_errors)
    model = compile_model(distorted(plain, wb.Distortion(0.1, 3)), NEITHER)
    generator = np.random.default_rng(4)
    point = 0.3 * generator.standard_normal((1, model.size))
    counts = model.observed_for("a test")
    _, gradient, hessian = model.derivatives(model.seeds(point), counts)
    terms = [place for place, name in enumerate(model.names) if name.startswith("distortion")]
    assert len(terms) == 6
    for place in terms:
        step = np.zeros((1, model.size))
        step[0, place] = 1e-4
        up, down = (model.derivatives(model.seeds(point + way * step), counts) for way in (1.0, -1.0))
        assert gradient[0, place] == pytest.approx(float(up[0][0] - down[0][0]) / 2e-4, rel=1e-5, abs=1e-6)
        assert hessian[0, place] == pytest.approx((up[1][0] - down[1][0]) / 2e-4, rel=1e-4, abs=1e-4)


def test_the_fit_gives_each_term_a_pull() -> None:
    analysis = distorted(bump_hunt(np.full(40, 25.0)), wb.Distortion(0.3, 2))
    found = {one.name: one for one in fit(analysis, NEITHER).fitted}
    tilt = found["distortion 2 in only"]
    assert tilt.role == "source"
    assert tilt.pull is not None
    assert tilt.pull > 1.0  # the counts are flat, the background falls


def test_more_terms_than_bins_with_background_are_refused() -> None:
    analysis = wb.Analysis(
        "Empty bins",
        (region_of([0.0, 1, 2, 3], [1.0, 2, 0], {"x": [4.0, 3.0, 0.0]}),),
        processes=(background("x", Template("x")),),
        hypotheses=(wb.Hypothesis("neither", ("x",), distortion=wb.Distortion(0.1, 3)),),
    )
    with pytest.raises(wb.InputError, match="3 terms, 2 bins"):
        compile_model(analysis, "neither")
