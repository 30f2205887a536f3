"""Intervals and excesses of small counts, against tables, another library and hand calculation."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy import stats

from workbench.plots.small_counts import ONE_SD, excess, interval


def test_the_interval_is_that_of_the_chi_square_quantiles() -> None:
    """Source: Garwood 1936 in chi-square form; scipy.stats is the independent route."""
    counts = np.arange(200.0)
    low, high = interval(counts)
    tail = 0.5 * (1.0 - ONE_SD)
    assert high == pytest.approx(0.5 * stats.chi2.isf(tail, 2.0 * (counts + 1.0)))
    assert low[1:] == pytest.approx(0.5 * stats.chi2.ppf(tail, 2.0 * counts[1:]))


def test_nothing_seen_has_the_upper_end_1_84() -> None:
    """By hand: exp(-high) = 0.15866, so high = 1.8410; one seen: the trade's 0.17 to 3.30."""
    low, high = interval([0.0, 1.0])
    assert low[0] == 0.0
    assert high[0] == pytest.approx(-math.log(0.5 * (1.0 - ONE_SD)))
    assert (low[1], high[1]) == (pytest.approx(0.1728, abs=1e-4), pytest.approx(3.2995, abs=1e-4))


def test_a_mean_is_inside_its_interval_at_least_as_often_as_promised() -> None:
    counts = np.arange(400.0)
    low, high = interval(counts)
    for mean in (0.3, 1.0, 3.7, 25.0, 140.2):
        covered = stats.poisson.pmf(counts, mean)[(low <= mean) & (mean <= high)].sum()
        assert covered >= ONE_SD
    straight = np.sqrt(counts)
    covered = stats.poisson.pmf(counts, 0.3)[np.abs(counts - 0.3) <= straight].sum()
    assert covered < ONE_SD  # sqrt(n) bars do not hold it


def test_an_excess_is_the_usual_one_for_large_counts() -> None:
    assert excess(10_100.0, 10_000.0) == pytest.approx(1.0, abs=2e-3)
    assert excess(9_900.0, 10_000.0) == pytest.approx(-1.0, abs=2e-3)


def test_a_deficit_is_negative_and_nothing_at_all_is_zero() -> None:
    assert excess(3.0, 3.0) == 0.0
    assert excess(0.0, 0.0) == 0.0
    assert excess(0.0, 2.0) == pytest.approx(-2.0)  # -sqrt(2 v), by hand
    assert excess(2.0, 0.0) == np.inf


def test_an_excess_over_little_stays_modest() -> None:
    """One event over 1e-9 expected: sqrt(2 (ln 1e9 - 1)) = 6.28, not 31,623."""
    assert excess(1.0, 1e-9) == pytest.approx(math.sqrt(2.0 * (math.log(1e9) - 1.0 + 1e-9)))
