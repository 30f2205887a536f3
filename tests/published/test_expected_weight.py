"""What evidence to expect, against sums over outcomes and limits worked by hand."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from workbench.evidence.formulas import expected_weight, on_off


def test_the_expected_weight_is_the_mean_over_all_outcomes() -> None:
    signal, background = np.array([4.0, 0.5, 7.0]), np.array([9.0, 0.2, 30.0])
    for_signal = for_background = 0.0
    for s, b in zip(signal, background, strict=True):
        counts = np.arange(200)
        weight = counts * np.log1p(s / b) - s
        for_signal += float(np.sum(stats.poisson.pmf(counts, s + b) * weight))
        for_background -= float(np.sum(stats.poisson.pmf(counts, b) * weight))
    assert expected_weight.expected_weight_for_signal(signal, background) == pytest.approx(
        for_signal, rel=1e-10
    )
    assert expected_weight.expected_weight_for_background(signal, background) == pytest.approx(
        for_background, rel=1e-10
    )


def test_the_expected_weight_is_half_the_squared_expected_significance() -> None:
    z = expected_weight.expected_significance(12.0, 40.0, 0.0)
    assert expected_weight.expected_weight_for_signal(12.0, 40.0) == pytest.approx(0.5 * z * z, rel=1e-12)


@pytest.mark.parametrize(
    ("s", "b", "sd"), [(5.0, 3.8, 0.9), (50.0, 100.0, 31.6), (0.3, 1e4, 80.0), (10.0, 0.5, 0.5)]
)
def test_the_expected_significance_is_the_on_off_likelihood_ratio_on_expected_counts(
    s: float, b: float, sd: float
) -> None:
    tau = b / sd**2
    direct = float(on_off.likelihood_ratio(s + b, tau * b, tau))
    assert expected_weight.expected_significance(s, b, sd) == pytest.approx(direct, rel=1e-7)


def test_a_small_background_error_leaves_the_known_background() -> None:
    known = expected_weight.expected_significance(12.0, 40.0, 0.0)
    assert expected_weight.expected_significance(12.0, 40.0, 1e-3) == pytest.approx(known, rel=1e-6)
    assert expected_weight.expected_significance(0.0, 40.0, 5.0) == 0.0


def test_a_small_signal_on_a_large_background_is_s_over_its_error() -> None:
    assert expected_weight.expected_significance(1.0, 1e6, 1000.0) == pytest.approx(
        1.0 / np.sqrt(2e6), rel=1e-3
    )


def test_counting_nothing_has_a_ceiling() -> None:
    """By hand: 1 + S."""
    odds = np.exp(expected_weight.ceiling_without_counts([3.0, 10.0, 30.0]))
    np.testing.assert_allclose(odds, [4.0, 11.0, 31.0], rtol=1e-13)


def test_a_background_error_stops_the_growth_of_evidence() -> None:
    """By hand: q = 0.1 and f = 0.05 give 2; the expected significance goes there as exposure grows."""
    limit = expected_weight.weight_at_endless_exposure(0.1, 0.05)
    assert limit == pytest.approx(2.0, rel=1e-13)
    q, f, b = 0.001, 0.0005, 1e12
    z = expected_weight.expected_significance(q * b, b, f * b)
    assert 0.5 * z * z == pytest.approx(expected_weight.weight_at_endless_exposure(q, f), rel=2e-3)
