"""Toy experiments: pseudo-data of a known truth, and the analysis that goes with them."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import numpy.typing as npt
import pytest
from scipy import stats

from tests.analyses import background, everything, region_of
from workbench.ensembles.toys import toy
from workbench.errors import InputError
from workbench.evidence.weigh import weigh
from workbench.hypotheses.alternatives import variants_of
from workbench.hypotheses.analysis import Analysis, Exposure
from workbench.hypotheses.file.reading import read_analysis
from workbench.hypotheses.shapes import Flat, Template
from workbench.likelihood.model import compile_model

Array = npt.NDArray[np.float64]
DATA = Path(__file__).parents[2] / "data"
SKERRY = read_analysis(DATA / "skerry" / "skerry.toml")
SET = {"strength": 1.2, "mass": 45.0}


def test_adding_exposure_in_steps_or_in_one_go_gives_the_same_counts() -> None:
    one = toy(SKERRY, true=SET, seed=7)
    steps = [one.counts(0.8 * (k + 1)) for k in range(45)]
    again = toy(SKERRY, true=SET, seed=7)
    np.testing.assert_array_equal(again.counts(36.0), steps[-1])
    np.testing.assert_array_equal(again.counts(8.0), steps[9])
    assert (np.diff(steps, axis=0) >= 0.0).all()
    assert not np.array_equal(toy(SKERRY, true=SET, seed=8).counts(36.0), steps[-1])


def test_the_analysis_of_a_toy_has_its_counts_and_expects_in_proportion() -> None:
    one = toy(SKERRY, true=SET, seed=7)
    found = one.at(6.0)
    assert found.exposure == replace(SKERRY.exposure or Exposure(1.0), collected=6.0)
    model, stated = (compile_model(each, "resonance") for each in (found, SKERRY))
    np.testing.assert_array_equal(model.observed_for("a test"), one.counts(6.0))
    points = np.random.default_rng(1).standard_normal((5, model.size))
    expected = stated.expected(stated.seeds(points))[0]
    np.testing.assert_allclose(model.expected(model.seeds(points))[0], 0.25 * expected, rtol=1e-12)
    assert one.at(24.0).processes == SKERRY.processes
    assert weigh(found).established


def test_counts_follow_the_truth() -> None:
    """Chi-square of all bins of many toys against the model's expected counts, with its own error."""
    model = compile_model(SKERRY, "resonance")
    values = {**SET, "continuum scale": 18.4, **dict.fromkeys(SKERRY.sources_used("resonance"), 0.5)}
    point = np.array([[values[name] for name in model.names]])
    expected = 2.5 * model.expected(model.natural_seeds(point))[0][0]
    counts = np.array([toy(SKERRY, true=values, seed=k).counts(60.0) for k in range(300)])
    # Poisson: the chi-square of n counts has mean n and variance n (2 + 1/mean).
    chi_square = float(((counts - expected) ** 2 / expected).sum())
    size = counts.size
    spread = np.sqrt(300 * (2.0 + 1.0 / expected).sum())
    assert abs(chi_square - size) < 4.0 * spread
    assert summed_p(counts, expected) > 1e-3
    # Negative control: a strength of 1 in place of 1.2 is seen.
    wrong = {**values, "strength": 1.0}
    other = 2.5 * model.expected(model.natural_seeds(np.array([[wrong[n] for n in model.names]])))[0][0]
    assert summed_p(counts, other) < 1e-3


def summed_p(counts: Array, expected: Array) -> float:
    """Return the p-value of the sums of many toys, whose pulls are normal, against their expectation."""
    pulls = (counts.sum(axis=0) - len(counts) * expected) / np.sqrt(len(counts) * expected)
    return float(stats.chi2(pulls.size).sf((pulls**2).sum()))


def test_the_truth_is_kept_back_and_then_told_in_full() -> None:
    one = toy(SKERRY, true={"strength": 1.375, "muon efficiency": -0.625}, seed=7)
    assert "1.375" not in repr(one)
    assert "1.375" not in repr(one.at(6.0))
    assert one.truth.values["strength"] == 1.375
    assert one.truth.values["muon efficiency"] == -0.625
    assert set(one.truth.values) == set(compile_model(SKERRY, "resonance").names)
    assert set(one.truth.drawn) == set(one.truth.values) - {"strength", "muon efficiency"}
    assert one.truth.seed == 7


def test_what_is_drawn_stays_whatever_else_is_set() -> None:
    free, held = toy(SKERRY, seed=7).truth, toy(SKERRY, true=SET, seed=7).truth
    assert {name: free.values[name] for name in held.drawn} == {n: held.values[n] for n in held.drawn}
    assert 20.0 < free.values["mass"] < 80.0


def test_what_is_left_out_is_drawn_from_its_prior() -> None:
    drawn = [toy(SKERRY, seed=k).truth.values for k in range(400)]
    masses = [one["mass"] for one in drawn]
    assert stats.kstest(masses, stats.uniform(20.0, 60.0).cdf).pvalue > 1e-3
    sources = [one["muon efficiency"] for one in drawn]
    assert stats.kstest(sources, stats.norm.cdf).pvalue > 1e-3
    assert stats.kstest(masses, stats.uniform(20.0, 50.0).cdf).pvalue < 1e-3  # negative control


def test_what_does_not_follow_exposure_is_there_from_the_start() -> None:
    steady = replace(background("noise", Flat(), 400.0), follows_exposure=False)
    analysis = Analysis(
        "Two", (region_of([0.0, 1, 2]),), (), (steady, background("b", Flat(), 60.0)), exposure=Exposure(3.0)
    )
    early = np.array([toy(analysis, seed=k).counts(1e-9).sum() for k in range(800)])
    late = np.array([toy(analysis, seed=k).counts(6.0).sum() for k in range(800)])
    assert abs(early.mean() - 400.0) < 4.0 * np.sqrt(400.0 / 800)
    assert abs((late - early).mean() - 120.0) < 4.0 * np.sqrt(120.0 / 800)
    grown = toy(analysis, seed=1).at(6.0)
    model = compile_model(grown, "background only")
    np.testing.assert_allclose(model.expected(model.natural_seeds(np.zeros((1, 0))))[0], [[260.0, 260.0]])


def templates() -> Analysis:
    region = region_of([0.0, 1, 2], None, {"t": [40.0, 9.0]}, {"t": [8.0, 4.5]})
    return Analysis("Noisy", (region,), (), (background("t", Template("t")),))


def test_a_bin_with_template_errors_has_one_factor_for_the_whole_run() -> None:
    """The accumulated law is negative binomial (scipy), and increments are correlated as one factor says."""
    seen = np.array([[toy(templates(), seed=k).counts(x) for x in (1.0, 2.0)] for k in range(4000)])
    shape = np.array([25.0, 4.0])
    for bin_, mean in enumerate((40.0, 9.0)):
        law = stats.nbinom(shape[bin_], shape[bin_] / (shape[bin_] + 2.0 * mean))
        low, high = int(law.ppf(0.005)), int(law.ppf(0.995))
        edges = np.unique(np.linspace(low, high, 14).astype(int))
        p = np.diff(law.cdf(edges), prepend=0.0, append=1.0)
        hits = np.bincount(np.searchsorted(edges, seen[:, 1, bin_]), minlength=p.size)
        assert stats.chisquare(hits, 4000 * p).pvalue > 1e-3
    first, second = seen[:, 0], seen[:, 1] - seen[:, 0]
    variance = np.array([64.0, 20.25])
    for bin_, mean in enumerate((40.0, 9.0)):
        # covariance V of the two halves; its spread as for two correlated normals, the tails allowed for
        product = (first[:, bin_] - mean) * (second[:, bin_] - mean)
        error = product.std() / np.sqrt(4000)
        assert abs(product.mean() - variance[bin_]) < 4.0 * error
        assert product.mean() > 8.0 * error  # negative control: a factor for each step would give 0


def test_what_can_not_be_true_is_refused_and_said() -> None:
    with pytest.raises(InputError) as caught:
        toy(SKERRY, true={"stength": 1.0, "mass": float("nan")})
    assert [problem.where for problem in caught.value.problems] == [
        'true value of "stength"',
        'true value of "mass"',
    ]
    assert caught.value.problems[0].remedy == 'write "strength"'
    with pytest.raises(InputError) as caught:
        toy(SKERRY, true={"strength": -1.0})
    assert caught.value.problems[0].where == "true value of strength"
    for exposure in (0.0, -1.0, float("inf"), float("nan")):
        with pytest.raises(InputError, match="exposure"):
            toy(SKERRY).counts(exposure)


def test_every_kind_of_process_can_be_drawn() -> None:
    analysis = everything()
    found = toy(analysis, hypothesis="background only", seed=3)
    exposure = 1.0 if analysis.exposure is None else analysis.exposure.collected
    assert compile_model(found.at(2.0 * exposure), "background only").observed is not None


def test_the_true_alternative_can_be_set_or_drawn() -> None:
    dunlin = read_analysis(DATA / "dunlin" / "dunlin.toml")
    names = [one.name for one in variants_of(dunlin, dunlin.hypotheses[-1].name)]
    assert len(names) > 1
    assert toy(dunlin, alternative=names[1], seed=2).truth.alternative == names[1]
    assert {toy(dunlin, seed=k).truth.alternative for k in range(40)} == set(names)
    with pytest.raises(InputError, match="No alternative"):
        toy(dunlin, alternative="nothing of the kind")
