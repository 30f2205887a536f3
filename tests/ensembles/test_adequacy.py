"""Adequacy: uniform where the hypothesis holds, tiny where it does not, and drawn no longer than needed."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import numpy.typing as npt
import pytest
from scipy import stats

from tests.analyses import background, bump_hunt, counting, region_of, with_observed
from workbench.ensembles import adequacy as module
from workbench.ensembles.adequacy import adequacy, share, statistic
from workbench.ensembles.drawing import draw_counts, draw_parameters
from workbench.errors import InputError
from workbench.hypotheses.analysis import Analysis, Parameter
from workbench.hypotheses.priors import LogNormal, Uniform
from workbench.hypotheses.shapes import Falling, Flat
from workbench.hypotheses.uncertainties import Effect, Uncertainty
from workbench.likelihood.model import compile_model
from workbench.likelihood.starts import searcher

Array = npt.NDArray[np.float64]
BACKGROUND = "background only"


def steep(observed: Array | None = None) -> Analysis:
    """Ten bins of a falling spectrum with an uncertain size and scale."""
    return Analysis(
        "Steep",
        (region_of(np.arange(11.0), observed),),
        (Parameter("scale", LogNormal(4.0, 1.1)),),
        (background("b", Falling("scale"), 300.0),),
        (Uncertainty("size", (Effect("b", 0.15),)),),
    )


def test_the_statistic_by_hand() -> None:
    """n = 7, b = 4 known: T = 2 (7 ln(7/4) + 4 - 7)."""
    search = searcher(compile_model(counting(7.0, 4.0), BACKGROUND))
    values, _, finished = statistic(search, np.array([[7.0], [0.0], [4.0]]))
    np.testing.assert_allclose(values, [2 * (7 * math.log(7 / 4) - 3), 8.0, 0.0], atol=1e-12)
    assert finished.all()


@pytest.mark.parametrize("observed", [4.0, 9.0, 12.0])
def test_p_of_a_known_background_is_that_of_the_sum_over_counts(observed: float) -> None:
    """All counts with T at least as large, added up by scipy; the tolerance is the p value's own error."""
    n = np.arange(200.0)
    t = 2 * (np.where(n > 0, n * np.log(np.maximum(n, 1) / 6.0), 0.0) + 6.0 - n)
    worse = t >= t[int(observed)] - 1e-9
    exact = float(stats.poisson.pmf(n[worse], 6.0).sum())
    found = adequacy(counting(observed, 6.0), BACKGROUND, seed=5)
    assert abs(found.p - exact) < 4 * max(
        found.p_error, math.sqrt(exact * (1 - exact) / found.pseudo_experiments)
    )
    assert found.statistic == pytest.approx(t[int(observed)])


def test_p_is_uniform_when_the_counts_come_from_the_hypothesis() -> None:
    """Parameters from their priors, counts from the law, 120 times: mean 1/2 +- 0.026, no pile anywhere."""
    model = compile_model(steep(), BACKGROUND)
    generator = np.random.default_rng(71)
    counts = draw_counts(model, draw_parameters(model, generator, 120), generator)
    p = np.array([adequacy(steep(row), BACKGROUND, seed=k, most=200).p for k, row in enumerate(counts)])
    assert abs(p.mean() - 0.5) < 4 / math.sqrt(12 * 120)
    for level in (0.1, 0.3, 0.7, 0.9):
        assert abs((p <= level).mean() - level) < 4 * math.sqrt(level * (1 - level) / 120) + 1 / 201
    assert stats.kstest(p, "uniform").pvalue > 1e-3


def test_a_wrong_background_shape_fails() -> None:
    """The negative control: a flat spectrum of the same size."""
    flat = np.random.default_rng(72).poisson(30.0, 10).astype(float)
    found = adequacy(steep(flat), BACKGROUND)
    assert found.p < 0.01
    assert found.fails
    assert not adequacy(steep(np.round(300 * np.diff(-np.exp(-np.arange(11) / 4.0)))), BACKGROUND).fails


def test_the_same_seed_gives_the_same_numbers_and_another_does_not() -> None:
    counts = (
        np.random.default_rng(73).poisson(300 * np.diff(-np.exp(-np.arange(11) / 4.0)) * 1.15).astype(float)
    )
    first, again, other = (adequacy(steep(counts), BACKGROUND, seed=seed) for seed in (3, 3, 4))
    assert first == again
    assert other.p != first.p
    assert other.statistic == first.statistic
    assert abs(other.p - first.p) < 4 * math.hypot(first.p_error, other.p_error)


def test_p_counts_the_observed_experiment_itself() -> None:
    """(1 + worse)/(1 + drawn) by hand; the error is never 0."""
    assert share(0, 199)[0] == pytest.approx(1 / 200)
    assert share(49, 199)[0] == pytest.approx(0.25)
    assert share(199, 199)[0] == 1.0
    assert share(49, 199)[1] == pytest.approx(math.sqrt(0.25 * 0.75 / 200), rel=0.01)
    assert 0.0 < share(199, 199)[1] < 0.01
    assert 0.0 < share(0, 199)[1] < 0.01


def test_two_hundred_are_enough_far_from_the_threshold() -> None:
    assert adequacy(counting(6.0, 6.0), BACKGROUND).pseudo_experiments == 200


def test_near_the_threshold_more_are_drawn_up_to_the_most() -> None:
    """P(n >= 12 or n = 0; 5) = 0.0055 + 0.0067 stays within 3 errors of 0.01 for 2000 and more."""
    found = adequacy(counting(12.0, 5.0), BACKGROUND, seed=2)
    assert found.pseudo_experiments == 2000
    assert abs(found.p - 0.01) < 3 * found.p_error
    assert adequacy(counting(12.0, 5.0), BACKGROUND, seed=2, most=700).pseudo_experiments == 700
    assert adequacy(counting(12.0, 5.0), BACKGROUND, seed=2, most=50).pseudo_experiments == 50


def test_it_stops_at_the_first_look_that_is_three_errors_away() -> None:
    found = adequacy(counting(30.0, 6.0), BACKGROUND)
    assert found.pseudo_experiments == 600  # after 200 with none worse, p = 0.005 +- 0.005 says too little
    assert found.p == pytest.approx(1 / 601)


def test_counts_that_fit_as_well_as_the_observed_ones_count_as_worse() -> None:
    """A free strength fits any excess exactly: T = 0 again and again. Ties were once broken by rounding."""
    found = adequacy(counting(12.0, 4.0, 2.0), "signal plus background")
    assert found.statistic == pytest.approx(0.0, abs=1e-6)
    assert found.p == 1.0


def test_what_has_a_flat_prior_is_held_at_its_fitted_value(monkeypatch: pytest.MonkeyPatch) -> None:
    """Sources and priors that prefer a value are drawn, uniform ones and signal parameters are held."""
    seen: list[Array] = []
    drawn = draw_parameters

    def watched(*arguments: object) -> Array:
        values: Array = drawn(*arguments)  # type: ignore[arg-type]
        seen.append(values)
        return values

    monkeypatch.setattr("workbench.ensembles.drawing.draw_parameters", watched)
    analysis = bump_hunt(np.full(40, 25.0))
    analysis = replace(
        analysis,
        parameters=(*analysis.parameters, Parameter("rate", Uniform(0.0, 3000.0))),
        processes=(*analysis.processes, background("flat", Flat(), "rate")),
    )
    adequacy(analysis, "signal plus background", most=100)
    spread = dict(
        zip(compile_model(analysis, "signal plus background").names, np.ptp(seen[0], axis=0), strict=True)
    )
    assert {name for name, width in spread.items() if width > 0} == {"scale", "continuum size"}


def test_the_hypotheses_of_an_analysis_have_their_own_pseudo_experiments() -> None:
    analysis = bump_hunt(np.full(40, 20.0))
    model = compile_model(analysis, BACKGROUND)
    first, second = (
        np.random.default_rng(np.random.SeedSequence(1, spawn_key=(1, index, 0))).random() for index in (0, 1)
    )
    assert first != second
    assert model.hypothesis == BACKGROUND
    assert module.THRESHOLD == 0.01


def test_adequacy_needs_counts_and_pseudo_experiments() -> None:
    with pytest.raises(InputError, match="adequacy needs observed counts"):
        adequacy(steep(), BACKGROUND)
    with pytest.raises(InputError, match="adequacy needs pseudo-experiments"):
        adequacy(counting(3.0, 3.0), BACKGROUND, most=0)


def test_a_bump_hunts_pseudo_experiments_are_all_fitted_to_the_end() -> None:
    analysis = bump_hunt()
    model = compile_model(analysis, "signal plus background")
    generator = np.random.default_rng(74)
    counts = draw_counts(model, np.array([[2.0, 50.0, 18.0, 0.3]]), generator)[0]
    found = adequacy(with_observed(analysis, counts), "signal plus background")
    assert found.unfinished_fits == 0
    assert found.p > 0.01
