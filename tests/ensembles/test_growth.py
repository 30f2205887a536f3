"""Counts that grow with exposure: their law, and that the steps make no difference."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from workbench.ensembles.growth import Growth


def seed_of(number: int) -> np.random.SeedSequence:
    return np.random.SeedSequence(number, spawn_key=(9,))


def test_steps_and_one_go_give_the_same_counts() -> None:
    rates = np.array([0.0, 0.3, 4.0, 700.0, 1e9])
    steps = np.cumsum(np.full(70, 0.1))  # 0.1 + 0.1 + 0.1 is not 0.3 in double precision, 7 of 70 end a block
    one, other = Growth(rates, seed_of(1)), Growth(rates, seed_of(1))
    forward = [one.counts(x) for x in steps]
    backward = [other.counts((k + 1) / 10.0) for k in reversed(range(70))][::-1]
    np.testing.assert_array_equal(forward, backward)
    assert (np.diff(forward, axis=0) >= 0.0).all()
    assert not np.array_equal(forward[-1], Growth(rates, seed_of(2)).counts(7.0))


def test_increments_are_poisson_and_independent() -> None:
    """Chi-square of increments against scipy's Poisson probabilities; correlations with their own error."""
    runs, mean = 4000, 3.0
    at = np.array([0.17, 0.5, 0.9, 1.3, 3.1, 5.6])
    rates = np.array([mean])
    paths = np.array([[Growth(rates, seed_of(k)).counts(x)[0] for x in at] for k in range(runs)])
    increments = np.diff(np.concatenate([np.zeros((runs, 1)), paths], axis=1), axis=1)
    expected = mean * np.diff(at, prepend=0.0)
    for seen, rate in zip(increments.T, expected, strict=True):
        assert p_of(seen, rate) > 1e-3
        assert p_of(seen, 1.15 * rate) < 1e-3  # negative control: a rate 15 % off is far outside
    correlation = np.corrcoef(increments.T)[np.triu_indices(at.size, 1)]
    assert (np.abs(correlation) < 4.0 / np.sqrt(runs)).all()
    # Negative control: counts drawn afresh at every exposure are no increments of one run.
    fresh = np.random.default_rng(3).poisson(mean * at, (runs, at.size))
    redrawn = np.corrcoef(np.diff(fresh, axis=1).T)[0, 1]
    assert abs(redrawn) > 8.0 / np.sqrt(runs)


def p_of(seen: np.ndarray, rate: float) -> float:
    """Return the p-value of counts against Poisson, cells of fewer than 20 expected joined."""
    last = int(stats.poisson(rate).isf(20.0 / seen.size))
    p = stats.poisson(rate).pmf(np.arange(last))
    hits = np.bincount(np.minimum(seen, last).astype(int), minlength=last + 1)
    return float(stats.chisquare(hits, seen.size * np.append(p, 1.0 - p.sum())).pvalue)


def test_bins_are_independent_and_each_keeps_its_rate() -> None:
    """Mean against rate with the standard error of a Poisson mean."""
    rates = np.array([0.2, 5.0, 5.0, 80.0])
    paths = np.array([Growth(rates, seed_of(k)).counts(2.4) for k in range(3000)])
    pulls = (paths.mean(axis=0) - 2.4 * rates) / np.sqrt(2.4 * rates / 3000)
    assert (np.abs(pulls) < 4.0).all()
    correlation = np.corrcoef(paths.T)[np.triu_indices(4, 1)]
    assert (np.abs(correlation) < 4.0 / np.sqrt(3000)).all()


@pytest.mark.parametrize("exposure", [1e-12, 1e-3, 1e6])
def test_exposures_far_from_the_stated_one_can_be_asked_for(exposure: float) -> None:
    rates = np.array([1e4, 0.0])
    found = Growth(rates, seed_of(4)).counts(exposure)
    assert abs(found[0] - 1e4 * exposure) < 6.0 * np.sqrt(1e4 * exposure) + 1.0
    assert found[1] == 0.0
