"""The disagreement of p-values and Bayes factors, as printed."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import integrate, stats

from tests.published.printed import Printed, of_topic
from workbench.evidence.formulas import expected_weight, reference_odds, two_rates


@of_topic("lindley", "lindley")
def test_a_point_null_against_a_normal_prior(printed: Printed) -> None:
    printed.check(float(reference_odds.null_posterior_normal_prior(printed.inputs["t"], printed.inputs["n"])))


@of_topic("lindley", "births-p", "jahn-p")
def test_the_p_value_of_a_split_in_two(printed: Printed) -> None:
    counts = printed.inputs["n1"], printed.inputs["n2"]
    printed.check(2.0 * two_rates.difference_tail(counts, (1.0, 1.0), "score"))


@pytest.mark.parametrize("significance", [-2.0, 0.0, 1.0, 3.0, 5.0, 30.0])
@pytest.mark.parametrize("width", [0.1, 1.0, 10.0, 1e4])
def test_the_half_normal_weight_is_its_integral(significance: float, width: float) -> None:
    spread = width / np.sqrt(1.0 + width**2)
    peak = max(significance * spread**2, 0.0)

    def ln_integrand(signal: float) -> float:
        return float(stats.norm.logpdf(significance, signal) + stats.halfnorm.logpdf(signal, scale=width))

    total, _ = integrate.quad(
        lambda signal: np.exp(ln_integrand(signal) - ln_integrand(peak)),
        max(peak - 12.0 * spread, 0.0),
        peak + 12.0 * spread,
        points=[peak] if peak > 0.0 else None,
        epsrel=1e-12,
        limit=200,
    )
    direct = np.log(total) + ln_integrand(peak) - stats.norm.logpdf(significance)
    weight = float(expected_weight.half_normal_weight(significance, width))
    assert weight == pytest.approx(direct, abs=1e-8)


def test_at_three_sigma_the_odds_turn_over_as_the_prior_widens() -> None:
    """Worked numerically elsewhere: 36, 1.8 and 0.018 for widths of 3, 100 and 10,000 errors."""
    odds = np.exp(expected_weight.half_normal_weight(3.0, [3.0, 100.0, 1e4]))
    np.testing.assert_allclose(odds, [36.0, 1.8, 0.018], rtol=0.01)


def test_the_ceiling_is_the_weight_of_a_result_on_the_expectation() -> None:
    """By hand: sqrt(1 + 10^2) = 10.05; fluctuations of one and two errors downwards reach 19 and 30."""
    odds = np.exp(-expected_weight.half_normal_weight([0.0, -1.0, -2.0], 10.0))
    np.testing.assert_allclose(odds, [np.sqrt(101.0), 19.16, 29.78], rtol=1e-3)
    assert float(expected_weight.ceiling_on_expectation(10.0)) == pytest.approx(np.log(odds[0]), rel=1e-12)
