"""Pseudo-experiments: their moments, and that each is the same whoever draws it."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest
from scipy import stats

from tests.analyses import background, everything, region_of
from workbench.ensembles.drawing import BLOCK, draw_counts, draw_parameters, pseudo_experiments
from workbench.hypotheses.analysis import Analysis, Parameter
from workbench.hypotheses.priors import Gamma, LogNormal
from workbench.hypotheses.shapes import Flat, Template
from workbench.likelihood.model import Model, compile_model

Array = npt.NDArray[np.float64]
SEED = np.random.SeedSequence(61, spawn_key=(3,))


def gathered(model: Model, number: int, first: int = 0) -> Array:
    return np.concatenate(list(pseudo_experiments(model, SEED, number, first=first)))


def simulated(errors: bool) -> Model:
    columns, given = {"t": [40.0, 9.0, 0.0]}, {"t": [8.0, 4.5, 0.0]}
    region = region_of([0.0, 1, 2, 3], None, columns, given if errors else None)
    analysis = Analysis(
        "Drawn",
        (region,),
        (Parameter("k", LogNormal(1.0, 1.1)),),
        (background("t", Template("t"), None, "k"),),
    )
    return compile_model(analysis, "background only")


def test_a_pseudo_experiment_is_the_same_however_the_ensemble_is_cut() -> None:
    model = compile_model(everything(), "signal plus background")
    whole = gathered(model, 330)
    assert whole.shape == (330, model.bins)
    pieces = [gathered(model, 150), gathered(model, 37, 150), gathered(model, 143, 187)]
    np.testing.assert_array_equal(np.concatenate(pieces), whole)
    np.testing.assert_array_equal(gathered(model, 1, 329), whole[329:])


def test_blocks_are_not_alike() -> None:
    model = compile_model(everything(), "signal plus background")
    whole = gathered(model, 2 * BLOCK)
    assert not np.array_equal(whole[:BLOCK], whole[BLOCK:])


@pytest.mark.parametrize("errors", [False, True])
def test_counts_have_the_moments_of_their_law(errors: bool) -> None:
    """Mean T, variance T + V; tolerances from the standard errors of a mean and of a variance."""
    model, number = simulated(errors), 20_000
    values = np.ones((number, 1))
    counts = draw_counts(model, values, np.random.default_rng(62))
    total = np.array([40.0, 9.0])
    variance = total + (np.array([8.0, 4.5]) ** 2 if errors else 0.0)
    found = counts[:, :2]
    assert (np.abs(found.mean(axis=0) - total) < 4 * np.sqrt(variance / number)).all()
    fourth = ((found - total) ** 4).mean(axis=0)
    spread = np.sqrt((fourth - variance**2) / number)
    assert (np.abs(found.var(axis=0) - variance) < 4 * spread).all()
    assert (counts[:, 2] == 0).all()
    # Negative control: the other law's variance is far outside.
    other = total + (0.0 if errors else np.array([8.0, 4.5]) ** 2)
    assert (np.abs(found.var(axis=0) - other) > 8 * spread).all()


def test_counts_follow_the_law_that_the_likelihood_uses() -> None:
    """Chi-square of drawn counts against the likelihood's own probabilities, p from scipy."""
    model, number = simulated(errors=True), 20_000
    counts = draw_counts(model, np.ones((number, 1)), np.random.default_rng(63))[:, 1]
    trials = np.stack([np.full(30, 40.0), np.arange(30.0), np.zeros(30)], axis=1)
    ln_p = model.ln_likelihood(model.natural_seeds(np.ones((30, 1))), trials)
    # Bins are independent: only the second one's probability changes, and that of 0 is (A/(A + T))^A.
    shape = (9.0 / 4.5) ** 2
    p = np.exp(ln_p - ln_p[0]) * (shape / (shape + 9.0)) ** shape
    hits = np.bincount(np.minimum(counts, 30).astype(int), minlength=31)
    assert stats.chisquare(hits, number * np.append(p, 1.0 - p.sum())).pvalue > 1e-3


def test_parameters_are_drawn_from_their_priors_or_held() -> None:
    analysis = Analysis(
        "Priors",
        (region_of([0.0, 1.0]),),
        (Parameter("rate", Gamma(3.0, 0.1)), Parameter("k", LogNormal(2.0, 1.3))),
        (background("b", Flat(), "rate", "k"),),
    )
    model = compile_model(analysis, "background only")
    free = draw_parameters(model, np.random.default_rng(64), 4000)
    assert stats.kstest(free[:, 0], stats.gamma(3.0, scale=10.0).cdf).pvalue > 1e-3
    assert stats.kstest(np.log(free[:, 1] / 2.0) / np.log(1.3), stats.norm.cdf).pvalue > 1e-3
    held = draw_parameters(model, np.random.default_rng(64), 4000, np.array([np.nan, 7.0]))
    np.testing.assert_array_equal(held[:, 0], free[:, 0])
    assert (held[:, 1] == 7.0).all()


def test_expectations_beyond_any_count_do_not_break_the_generator() -> None:
    analysis = Analysis(
        "Wild",
        (region_of([0.0, 1.0]),),
        (Parameter("k", LogNormal(1.0, 1e6)),),
        (background("b", Flat(), 1e12, "k"),),
    )
    model = compile_model(analysis, "background only")
    counts = gathered(model, 100)
    assert np.isfinite(counts).all()
    assert (counts >= 0).all()
    assert 0.9e15 < counts.max() < 1.1e15
