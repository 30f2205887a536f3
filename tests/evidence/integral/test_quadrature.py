"""The evidence by quadrature: against brute force and adaptive quadrature, where others go wrong."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import numpy.typing as npt
import pytest
from scipy import integrate as reference
from scipy import special, stats

from tests.evidence.brute_force import ln_evidence, standard_normal, under
from tests.evidence.small_analyses import YIELD, bump, counting, several_bins, source, templates
from workbench.evidence.integral.quadrature import Grid, integrate
from workbench.evidence.weigh import weigh
from workbench.hypotheses.analysis import Analysis, Hypothesis
from workbench.hypotheses.priors import Exponential, Gamma, HalfNormal, LogNormal, Prior, Uniform
from workbench.hypotheses.processes import Contribution, Process
from workbench.hypotheses.shapes import Gaussian
from workbench.likelihood.model import Model, compile_model

Array = npt.NDArray[np.float64]

SIGNAL = "signal plus background"
CONTINUUM: Array = 400.0 * -np.diff(np.exp(-np.linspace(0.0, 20.0, 41) / 8.0)) / -np.expm1(-20.0 / 8.0)


def compiled(analysis: Analysis, hypothesis: str = SIGNAL) -> Model:
    return compile_model(analysis, hypothesis)


def grid_of(model: Model) -> Grid:
    assert model.observed is not None
    grid = integrate(model, model.observed)
    assert grid is not None
    return grid


def sampled(analysis: Analysis, hypothesis: str = SIGNAL) -> tuple[float, float]:
    """Return the reported ln evidence and error, closed forms left out; it has to be established."""
    names = [one.name for one in analysis.hypotheses]
    evidence = weigh(analysis, closed_forms=False).evidences[names.index(hypothesis)]
    assert evidence.established, evidence.reason
    assert evidence.ln_evidence is not None
    assert evidence.error is not None
    return evidence.ln_evidence, evidence.error


def with_a_peak(mass: float, events: float, seed: int = 4) -> Array:
    """Return counts of the bump analysis with some more events at a mass."""
    edges = np.linspace(0.0, 20.0, 41)
    peak = events * np.diff(special.ndtr((edges - mass) / 0.4))
    return np.asarray(np.random.default_rng(seed).poisson(CONTINUUM + peak), dtype=float)


def assert_right(model: Model, exact: float, slack: float = 1e-3) -> Grid:
    """Check the quadrature against an exact number, within its own error and a little more."""
    grid = grid_of(model)
    assert abs(grid.ln_evidence - exact) < 3.0 * grid.error + slack
    assert grid.error < 0.05
    return grid


@pytest.mark.parametrize(
    ("n", "b"), [(5, 10.0), (80, 100.0), (900, 1000.0)], ids=["5 on 10", "80 on 100", "900 on 1000"]
)
def test_a_deficit_is_right_where_plain_laplace_is_wrong_by_about_two(n: int, b: float) -> None:
    """p(n) = r exp(b r) (1 + r)^(-n-1) Q(n + 1, b (1 + r)), r = 1/mean, Q the upper gamma function's share.

    Plain Laplace takes the best strength, which is 0, and a whole Gaussian of the curvature there.
    """
    mean = 20.0 * np.sqrt(b)
    r = 1.0 / mean
    exact = np.log(r) + b * r - (n + 1) * np.log1p(r) + np.log(special.gammaincc(n + 1, b * (1.0 + r)))
    laplace = stats.poisson.logpmf(n, b) + np.log(r) + 0.5 * np.log(2.0 * np.pi / (n / b**2))
    assert 1.7 < laplace - exact < 2.4
    analysis = counting(n, b, Exponential(mean / YIELD))
    assert_right(compiled(analysis), exact)
    found, error = sampled(analysis)
    assert abs(found - exact) < 5.0 * error


@pytest.mark.parametrize(
    "strength", [Uniform(0.0, 5.0), HalfNormal(1.0), LogNormal(0.5, 3.0), Gamma(1.5, 1.0)]
)
@pytest.mark.parametrize(("n", "b"), [(0, 3.0), (4, 10.0), (10, 10.0), (40, 12.0)])
def test_one_count_is_the_integral_by_adaptive_quadrature(n: int, b: float, strength: Prior) -> None:
    """scipy.integrate.quad with points where the integrand peaks."""
    best = max(n - b, 0.5) / YIELD
    width = np.sqrt(n + 1.0) / YIELD
    value, _ = reference.quad(
        lambda x: stats.poisson.pmf(n, b + YIELD * x) * np.exp(strength.ln_density(np.array([x]))[0]),
        0.0,
        min(strength.support[1], 40.0),
        points=sorted({0.05, 0.3, best, best + width, best + 3.0 * width, 4.5}),
        epsabs=1e-14,
        limit=400,
    )
    analysis = counting(n, b, strength)
    assert_right(compiled(analysis), np.log(value))
    found, error = sampled(analysis)
    assert abs(found - np.log(value)) < 5.0 * error


def test_another_prior_would_be_seen() -> None:
    """The negative control of the comparisons here: a strength's prior a tenth wider is far outside."""
    grid = grid_of(compiled(counting(40, 12.0, HalfNormal(1.0))))
    other = grid_of(compiled(counting(40, 12.0, HalfNormal(1.1))))
    assert abs(grid.ln_evidence - other.ln_evidence) > 3.0 * grid.error + 0.1


def test_a_billion_counts_are_right_where_adaptive_quadrature_silently_returns_nothing() -> None:
    """2e9 counts on 1e9 of background: the strength is known to 5e-5 of a range of 10.

    With points at the peak the same quadrature agrees with us; without, it reports 0 with an error of 0.
    """
    n, b = 2_000_030_000.0, 1e9
    top = stats.poisson.logpmf(n, n)

    def relative(x: float) -> float:
        mean = b * (1.0 + x)
        return float(np.exp(n * np.log1p((mean - n) / n) - (mean - n)))

    blind, claimed = reference.quad(relative, 0.0, 10.0)
    assert (blind, claimed) == (0.0, 0.0)
    peak, width = n / b - 1.0, np.sqrt(n) / b
    told, _ = reference.quad(
        relative, 0.0, 10.0, points=[peak - 6.0 * width, peak, peak + 6.0 * width], limit=200
    )
    region = several_bins("r", [n], {"background": [b], "signal": [b]})
    analysis = templates(region, Uniform(0.0, 10.0))
    exact = top + np.log(told / 10.0)
    assert_right(compiled(analysis), exact)
    found, error = sampled(analysis)
    assert abs(found - exact) < 5.0 * error


@pytest.mark.parametrize("mass", [1.05, 6.4, 10.0, 18.97], ids=["low edge", "6.4", "10", "high edge"])
def test_a_bump_is_the_sum_over_mass_and_strength_wherever_it_stands(mass: float) -> None:
    model = compiled(bump(with_a_peak(mass, 25.0)))
    exact = ln_evidence(
        model,
        {
            "strength": under(Uniform(0.0, 5.0), *np.linspace(0.0, 5.0, 5), nodes=12),
            "mass": under(Uniform(1.0, 19.0), *np.linspace(1.0, 19.0, 37), nodes=6),
        },
    )
    assert_right(model, exact)


def test_two_bumps_at_once_both_count() -> None:
    """Two masses describe the counts equally well: the sum has both, either alone would be ln 2 off."""
    edges = np.linspace(0.0, 20.0, 41)
    peaks = sum(30.0 * np.diff(special.ndtr((edges - mass) / 0.4)) for mass in (5.0, 15.0))
    analysis = bump(np.round(CONTINUUM.mean() + peaks), continuum=400.0)
    model = compiled(analysis)
    rules = {
        "strength": under(Uniform(0.0, 5.0), *np.linspace(0.0, 5.0, 5), nodes=12),
        "mass": under(Uniform(1.0, 19.0), *np.linspace(1.0, 19.0, 37), nodes=6),
    }
    assert_right(model, ln_evidence(model, rules))


def test_a_deficit_everywhere_leaves_the_mass_flat_and_the_evidence_right() -> None:
    model = compiled(bump(np.floor(0.7 * CONTINUUM), strength=HalfNormal(2.0)))
    rules = {
        "strength": under(HalfNormal(2.0), *np.linspace(0.0, 3.0, 7), 12.0, nodes=12),
        "mass": under(Uniform(1.0, 19.0), *np.linspace(1.0, 19.0, 37), nodes=6),
    }
    grid = assert_right(model, ln_evidence(model, rules))
    integrals = grid.columns.ln_integral()
    assert np.ptp(integrals) < 1.5


def test_a_mass_that_nothing_depends_on_leaves_the_evidence_of_the_background() -> None:
    """Strength held at 0: the mass is a flat direction, integrated by its prior."""
    counts = with_a_peak(8.0, 10.0)
    analysis = bump(counts, uncertainties=(source("size", continuum=0.05),))
    still = replace(
        analysis,
        hypotheses=(
            Hypothesis("background only", ("continuum",)),
            Hypothesis("no signal", ("continuum", "peak"), fix={"strength": 0.0}),
        ),
    )
    model = compiled(still, "no signal")
    assert model.names == ("mass", "size")
    alone = grid_of(compiled(still, "background only"))
    assert grid_of(model).ln_evidence == pytest.approx(alone.ln_evidence, abs=1e-5)
    found, error = sampled(still, "no signal")
    other, other_error = sampled(still, "background only")
    assert abs(found - other) < 5.0 * np.hypot(error, other_error)


def test_an_unconstrained_nuisance_parameter_leaves_the_evidence_unchanged() -> None:
    """A source whose effect is nothing at all, or nothing that can be seen, integrates to one."""
    counts = with_a_peak(8.0, 10.0)
    plain = compiled(bump(counts, uncertainties=(source("size", continuum=0.05),)))
    for idle in (0.0, 1e-9):
        more = (source("size", continuum=0.05), source("idle", continuum=idle))
        model = compiled(bump(counts, uncertainties=more))
        assert "idle" in model.names
        assert grid_of(model).ln_evidence == pytest.approx(grid_of(plain).ln_evidence, abs=1e-6)


def test_one_nuisance_parameter_is_its_integral() -> None:
    counts = [14.0, 22.0, 9.0]
    region = several_bins("r", counts, {"background": [10.0, 15.0, 8.0], "signal": [1.0, 6.0, 2.0]})
    model = compiled(templates(region, Exponential(1.0), (source("size", background=0.3),)))
    rules = {
        "strength": under(Exponential(1.0), *np.linspace(0.0, 6.0, 7), 20.0, nodes=12),
        "size": standard_normal(),
    }
    assert_right(model, ln_evidence(model, rules))


def with_log_effects(counts: list[float], table: Array) -> Analysis:
    """Return templates whose processes scale by exp(table @ z), one column of the table a source."""
    region = several_bins(
        "r",
        counts,
        {"first": [30.0, 20.0, 10.0, 5.0], "second": [3.0, 6.0, 9.0, 12.0], "signal": [0.0, 5.0, 8.0, 0.0]},
    )
    names = ("first", "second", "signal")
    made = tuple(
        source(f"source {index}", **dict(zip(names, np.expm1(column), strict=True)))
        for index, column in enumerate(table.T)
    )
    return templates(region, Uniform(0.0, 4.0), made)


TABLE = np.array([[0.20, 0.05, 0.0], [0.10, -0.15, 0.0], [0.05, 0.02, 0.1]])
COUNTS = [35.0, 36.0, 27.0, 15.0]


def test_turning_the_sources_leaves_the_evidence_unchanged() -> None:
    """ln factors A z with independent standard-normal z have the law of A R z for every rotation R."""
    turn = stats.ortho_group.rvs(3, random_state=np.random.default_rng(3))
    plain, turned = (compiled(with_log_effects(COUNTS, table)) for table in (TABLE, TABLE @ turn))
    assert grid_of(turned).ln_evidence == pytest.approx(grid_of(plain).ln_evidence, abs=1e-3)
    found = [sampled(with_log_effects(COUNTS, table)) for table in (TABLE, TABLE @ turn)]
    assert abs(found[0][0] - found[1][0]) < 5.0 * np.hypot(found[0][1], found[1][1])


def test_wholly_correlated_sources_are_one_source_of_their_joint_size() -> None:
    """Three sources that do the same: directions across them are not constrained at all, and harm nothing."""
    one = np.array([[0.2], [0.1], [0.05]])
    three = one @ np.array([[2.0, 2.0, 1.0]]) / 3.0
    single, triple = (grid_of(compiled(with_log_effects(COUNTS, table))) for table in (one, three))
    assert triple.ln_evidence == pytest.approx(single.ln_evidence, abs=1e-3)


def test_another_size_of_a_source_would_be_seen() -> None:
    """The negative control of the two tests above: sources a quarter larger move ln Z far more."""
    grown = grid_of(compiled(with_log_effects(COUNTS, 1.25 * TABLE)))
    assert abs(grown.ln_evidence - grid_of(compiled(with_log_effects(COUNTS, TABLE))).ln_evidence) > 0.02


def test_the_reported_mode_names_the_nuisance_coordinates_only() -> None:
    grid = grid_of(compiled(bump(with_a_peak(8.0, 10.0), uncertainties=(source("size", continuum=0.05),))))
    assert set(grid.mode) == {"size"}


def test_too_many_nodes_are_declined() -> None:
    """Two masses with 90 resolution elements each would take tens of thousands of columns."""
    one = bump(np.round(CONTINUUM), resolution=0.2)
    peak = one.process("peak")
    other = Process("other peak", "signal", {"spectrum": Contribution(Gaussian("other mass", 0.2), 12.0)})
    both = replace(
        one,
        parameters=(*one.parameters, replace(one.parameter("mass"), name="other mass")),
        processes=(one.process("continuum"), peak, other),
        hypotheses=(),
    )
    model = compiled(both)
    assert model.observed is not None
    assert integrate(model, model.observed) is None
    evidence = weigh(both, engine="standard").evidences[1]
    assert (evidence.ln_evidence, evidence.established) == (None, False)
    assert "more nodes than can be held" in evidence.reason
