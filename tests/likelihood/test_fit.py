"""Fits against other programs and by hand."""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt
import pytest
from scipy import optimize, stats
from statsmodels.genmod import families
from statsmodels.genmod.generalized_linear_model import GLM

from tests.analyses import (
    BOTH,
    background,
    counting,
    everything,
    of,
    one_hypothesis,
    region_of,
    seen_bump,
    signal,
)
from workbench.hypotheses.analysis import Analysis, Parameter
from workbench.hypotheses.priors import Gamma, LogUniform, Uniform
from workbench.hypotheses.shapes import Flat, Gaussian, Template
from workbench.hypotheses.uncertainties import Effect, Uncertainty
from workbench.likelihood.fit import fit
from workbench.likelihood.model import Model, compile_model
from workbench.likelihood.objective import fit_objective
from workbench.likelihood.parts import Seeds
from workbench.likelihood.results import Ending, Fit

Array = npt.NDArray[np.float64]


def test_a_count_by_hand() -> None:
    """n = 12, b = 4, s = 2: strength 4, its sd sqrt(12)/2, and sides where n ln v - v falls by 1/2."""
    found = fit(counting(12.0, 4.0, 2.0), BOTH)
    strength = of(found, "strength")
    assert found.ending is Ending.CONVERGED
    assert strength.value == pytest.approx(4.0, abs=1e-4)
    assert strength.error == pytest.approx(math.sqrt(12) / 2, rel=1e-4)
    assert found.ln_likelihood == pytest.approx(stats.poisson.logpmf(12, 12.0))

    def fall(v: float) -> float:
        return 12 * math.log(v / 12) - v + 12 + 0.5

    assert strength.low == pytest.approx((optimize.brentq(fall, 5.0, 12.0) - 12) / 2, rel=1e-4)
    assert strength.high == pytest.approx((optimize.brentq(fall, 12.0, 25.0) - 12) / 2, rel=1e-4)
    assert strength.pull is None
    assert strength.contraction is None


def test_a_poisson_regression_agrees_with_statsmodels() -> None:
    """Three levels times two, as multiplying parameters; statsmodels' GLM as the independent route."""
    generator = np.random.default_rng(51)
    counts = generator.poisson([[20, 45], [31, 80], [12, 25]]).astype(float)
    names = ["a0", "a1", "a2", "b1"]
    regions, processes, rows = [], [], []
    for row in range(3):
        for column in range(2):
            name = f"cell {row}{column}"
            factors = (f"a{row}",) + (("b1",) if column else ())
            regions.append(region_of([0.0, 1.0], [counts[row, column]], name=name))
            processes.append(background(name, Flat(), 1.0, *factors, region=name))
            rows.append([float(name == f"a{row}") for name in names[:3]] + [float(column)])
    parameters = tuple(Parameter(name, LogUniform(1e-3, 1e4)) for name in names)
    found = fit(Analysis("Regression", tuple(regions), parameters, tuple(processes)), "background only")
    truth = GLM(counts.ravel(), np.array(rows), family=families.Poisson()).fit(tol=1e-12)
    values = np.array([of(found, name).value for name in names])
    errors = np.array([of(found, name).error for name in names])
    np.testing.assert_allclose(np.log(values), truth.params, atol=1e-4)
    np.testing.assert_allclose(errors / values, truth.bse, rtol=1e-4)
    assert found.ln_likelihood == pytest.approx(truth.llf, abs=1e-7)
    np.testing.assert_allclose(found.expected, truth.fittedvalues, rtol=1e-4)
    correlation = truth.cov_params() / np.outer(truth.bse, truth.bse)
    np.testing.assert_allclose(found.correlations, correlation, atol=1e-4)


def test_a_whole_analysis_agrees_with_scipy() -> None:
    """scipy.optimize.minimize from the fitted point and from others finds nothing higher."""
    analysis = everything()
    found = fit(analysis, BOTH, asymmetric=False)
    model = compile_model(analysis, BOTH)
    objective = fit_objective(model)
    assert model.observed is not None
    best = np.array([one.value for one in found.fitted])
    assert float(objective.value(best[None], model.observed)[0]) == pytest.approx(found.penalised, abs=1e-9)
    bounds = [(low, high) for low, high in zip(objective.low, objective.high, strict=True)]
    for point in (best, model.natural_seeds(model.seeds(np.full((1, model.size), 0.3)).x.T).x[:, 0]):
        other = optimize.minimize(
            lambda x: -float(objective.value(x[None], model.observed)[0]),
            point,
            jac=lambda x: -objective.derivatives(x[None], model.observed)[1][0],
            bounds=bounds,
            method="L-BFGS-B",
            options={"maxiter": 400},
        )
        assert found.penalised >= -other.fun - 1e-5


def profile(analysis: Analysis, hypothesis: str, index: int, at: float, start: Array) -> float:
    """The largest penalised ln likelihood with one coordinate held, by scipy."""
    model = compile_model(analysis, hypothesis)
    objective, counts = fit_objective(model), model.observed
    assert counts is not None
    rest = [k for k in range(model.size) if k != index]

    def cost(x: Array) -> tuple[float, Array]:
        point = start.copy()
        point[index], point[rest] = at, x
        value, gradient, _ = objective.derivatives(point[None], counts)
        return -float(value[0]), -gradient[0, rest]

    bounds = [(objective.low[k], objective.high[k]) for k in rest]
    found = optimize.minimize(
        cost, start[rest], jac=True, bounds=bounds, method="L-BFGS-B", options={"ftol": 1e-14, "gtol": 1e-9}
    )
    return -float(found.fun)


def test_asymmetric_errors_are_where_the_profile_has_fallen_by_a_half() -> None:
    analysis = seen_bump(3.0, 50.0)
    found = fit(analysis, BOTH)
    best = np.array([one.value for one in found.fitted])
    for index, one in enumerate(found.fitted):
        for side in (one.low, one.high):
            if one.role == "source":
                assert side is None
                continue
            assert side is not None
            top = profile(analysis, BOTH, index, one.value + side, best)
            assert found.penalised - top == pytest.approx(0.5, abs=1e-4)


def test_a_side_that_ends_before_the_fall_has_no_error() -> None:
    """n = 1, b = 1: the profile falls by 1/2 above, and by nothing between the value and 0."""
    strength = of(fit(counting(2.0, 1.0), BOTH), "strength")
    assert strength.value == pytest.approx(1.0, abs=1e-4)
    # By hand: 2 ln(1/2) + 1 = -0.386 at strength 0.
    assert strength.low is None
    assert strength.high is not None


def test_asymmetric_errors_of_all_parameters_are_searched_for_at_once(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    """A fit once took a second: the errors were searched for one after another, with values only."""
    calls = []
    exact, plain = Model.derivatives, Model.ln_likelihood

    def counted(model: Model, seeds: Seeds, counts: Array) -> tuple[Array, Array, Array]:
        calls.append(seeds.x.shape[1])
        return exact(model, seeds, counts)

    def counted_plain(model: Model, seeds: Seeds, counts: Array) -> Array:
        calls.append(seeds.x.shape[1])
        return plain(model, seeds, counts)

    monkeypatch.setattr(Model, "derivatives", counted)
    monkeypatch.setattr(Model, "ln_likelihood", counted_plain)
    analysis = seen_bump(3.0, 50.0)
    fit(analysis, BOTH, asymmetric=False)
    without = len(calls)
    calls.clear()
    fit(analysis, BOTH)
    assert len(calls) - without < 40


def test_correlated_sources_do_not_depend_on_how_they_are_turned() -> None:
    """N12: effects (a, a + c) of two sources, or the same turned by 30 degrees, describe one normal law."""
    counts = [130.0, 95.0]

    def analysis(turn: float) -> Analysis:
        first, second = np.array([0.10, 0.10]), np.array([0.10, 0.1001])
        cos, sin = math.cos(turn), math.sin(turn)
        pair = (cos * first + sin * second, -sin * first + cos * second)
        regions = tuple(region_of([0.0, 1.0], [n], name=f"r{i}") for i, n in enumerate(counts))
        processes = tuple(background(f"p{i}", Flat(), 100.0, region=f"r{i}") for i in range(2))
        sources = tuple(
            Uncertainty(
                f"s{k}", tuple(Effect(f"p{i}", math.expm1(effect)) for i, effect in enumerate(effects))
            )
            for k, effects in enumerate(pair)
        )
        return Analysis("Turned", regions, (), processes, sources)

    plain, turned = (fit(analysis(turn), "background only") for turn in (0.0, math.pi / 6))
    assert plain.ending is Ending.CONVERGED
    assert turned.penalised == pytest.approx(plain.penalised, abs=1e-8)
    np.testing.assert_allclose(turned.expected, plain.expected, rtol=1e-5)
    assert all(one.error is not None for one in (*plain.fitted, *turned.fitted))
    # In direction (1, 1) the data know ln v to 1/sqrt(2 x 110): correlation of the two sources by hand.
    information = np.eye(2) + np.einsum(
        "ka,kb,k->ab",
        np.array([[0.1, 0.1], [0.1, 0.1001]]),
        np.array([[0.1, 0.1], [0.1, 0.1001]]),
        plain.expected,
    )
    covariance = np.linalg.inv(information)
    by_hand = covariance[0, 1] / math.sqrt(covariance[0, 0] * covariance[1, 1])
    assert plain.correlations[0, 1] == pytest.approx(by_hand, abs=1e-3)


def asymmetric_source(up: float, down: float, observed: float) -> Fit:
    analysis = Analysis(
        "Sides",
        (region_of([0.0, 1.0], [observed]),),
        (),
        (background("b", Flat(), 1000.0),),
        (Uncertainty("s", (Effect("b", up, down),)),),
    )
    return fit(analysis, "background only")


def test_an_asymmetric_source_is_pulled_by_its_own_sides() -> None:
    """N13: up = 0.20, down = -0.10. 1200 counts ask for nearly z = 1, 900 for nearly z = -1."""
    high, low = asymmetric_source(0.20, -0.10, 1200.0), asymmetric_source(0.20, -0.10, 900.0)
    for found, nearly in ((high, 1.0), (low, -1.0)):
        z = of(found, "s")
        assert z.pull == z.value
        assert z.value == pytest.approx(nearly, abs=0.15)
        assert abs(z.value) < 1.0
        # By hand: at the maximum (n - v) d ln v/dz = z.
        c, u, d = 0.25, math.log(1.2), math.log(0.9)
        root = math.sqrt(z.value**2 + c * c)
        slope = (u - d) / 2 + (u + d) / 2 * z.value / root / (math.sqrt(1 + c * c) - c)
        n = found.expected[0] + z.value / slope
        assert n == pytest.approx(1200.0 if nearly > 0 else 900.0, rel=1e-5)


def test_a_one_sided_source_is_fitted_without_a_kink() -> None:
    """N13: both sides up. Counts below the nominal leave it near 0, counts above find the steeper side."""
    below, above = asymmetric_source(0.20, 0.10, 900.0), asymmetric_source(0.20, 0.10, 1200.0)
    assert below.ending is Ending.CONVERGED
    assert above.ending is Ending.CONVERGED
    assert abs(of(below, "s").value) < 0.5
    assert of(above, "s").value == pytest.approx(1.0, abs=0.1)


def test_penalties_are_those_of_the_contract() -> None:
    """By hand, n = 100: gamma of shape 4, rate 0.05 has its penalty in x, so (100 + 3)/(1 + 0.05)."""
    one_bin = (region_of([0.0, 1.0], [100.0]),)
    process = (background("b", Flat(), "rate"),)
    gamma = fit(Analysis("G", one_bin, (Parameter("rate", Gamma(4.0, 0.05)),), process), "background only")
    assert of(gamma, "rate").value == pytest.approx(103 / 1.05, rel=1e-5)
    flat = fit(Analysis("F", one_bin, (Parameter("rate", LogUniform(1, 1e4)),), process), "background only")
    assert of(flat, "rate").value == pytest.approx(100.0, rel=1e-5)
    assert flat.penalised == pytest.approx(flat.ln_likelihood, abs=1e-12)


def test_a_hypothesis_without_parameters_has_a_likelihood_and_nothing_else() -> None:
    found = fit(counting(3.0, 2.0), "background only")
    assert found.ending is Ending.CONVERGED
    assert found.fitted == ()
    assert found.correlations.shape == (0, 0)
    assert found.ln_likelihood == pytest.approx(stats.poisson.logpmf(3, 2.0))
    assert found.by_process["known"].tolist() == [2.0]


def test_template_errors_widen_the_fitted_error() -> None:
    """A background of 100 +- 20 from simulation: variance 140 + 20^2 instead of 140, to first order."""
    errors = {"b": [20.0]}
    columns = {"b": [100.0]}
    analyses = [
        Analysis(
            "Simulation",
            (region_of([0.0, 1.0], [140.0], columns, given),),
            (Parameter("strength", Uniform(0.0, 500.0)),),
            (background("b", Template("b")), signal("s", Flat(), 1.0, "strength")),
        )
        for given in (None, errors)
    ]
    plain, noisy = (of(fit(analysis, BOTH), "strength") for analysis in analyses)
    assert plain.error == pytest.approx(math.sqrt(140.0), rel=1e-3)
    assert noisy.error == pytest.approx(math.sqrt(140.0 + 400.0), rel=0.06)
    assert noisy.value == pytest.approx(plain.value, abs=3.0)


def test_huge_counts_are_fitted_to_their_digits() -> None:
    """N8: 1e9 counts in each of three bins; the size is known to 1/sqrt(3e9)."""
    columns = {"t": [1e9, 1e9, 1e9]}
    analysis = Analysis(
        "Huge",
        (region_of([0.0, 1, 2, 3], [1000031622.0, 999990000.0, 1000020000.0], columns),),
        (Parameter("size", Uniform(0.5, 2.0)),),
        (background("t", Template("t"), None, "size"),),
    )
    size = of(fit(analysis, "background only"), "size")
    assert size.value == pytest.approx(3000041622.0 / 3e9, abs=1e-9)
    assert size.error == pytest.approx(1 / math.sqrt(3e9), rel=1e-4)


def test_one_process_may_be_two_hypotheses() -> None:
    analysis = one_hypothesis(counting(12.0, 4.0, 2.0), "known", "sought", name="all of it")
    assert fit(analysis, "all of it").hypothesis == "all of it"


def test_a_gaussian_peak_is_measured_as_well_as_its_counts_allow() -> None:
    """Without background the mass sd is sd/sqrt(N): 1/sqrt(400), in the limit of fine bins."""
    edges = np.linspace(-6.0, 6.0, 241)
    expected = 400.0 * np.diff(stats.norm.cdf(edges, 0.1, 1.0))
    analysis = Analysis(
        "Peak",
        (region_of(edges, np.round(expected * 10)),),
        (Parameter("mass", Uniform(-2.0, 2.0)), Parameter("strength", Uniform(0.0, 20.0))),
        (signal("s", Gaussian("mass", 1.0), 400.0, "strength"),),
    )
    found = fit(analysis, BOTH)
    assert of(found, "mass").value == pytest.approx(0.1, abs=0.01)
    assert of(found, "mass").error == pytest.approx(1 / math.sqrt(4000), rel=0.01)
