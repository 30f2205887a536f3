"""Significances of on/off counts, and the classical tests of two rates, against printed tables."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest
from scipy import integrate, stats

from tests.published.printed import Printed, of_topic
from workbench.evidence.formulas import on_off, two_rates


def counted(n: int, b: float, sigma: float | None = None, model: str = "known") -> float:
    if sigma is None:
        return float(on_off.significance(on_off.known_tail(n, b)))
    assert model == "gauss-not-renormalised"
    return float(on_off.significance(on_off.gaussian_averaged_tail(n, b, sigma)))


def rates(x1: int, t1: float, x2: int, t2: float, test: Any) -> float:
    return two_rates.ratio_tail((x1, x2), (t1, t2), test)


def rate_difference(x1: int, t1: float, x2: int, t2: float, test: Any) -> float:
    return two_rates.difference_tail((x1, x2), (t1, t2), test)


METHODS: dict[str, Callable[..., float]] = {
    "z_on_off_binomial": lambda **of: float(on_off.significance(on_off.binomial_tail(**of))),
    "z_likelihood_ratio_on_off": lambda **of: float(on_off.likelihood_ratio(**of)),
    "z_profile_gauss": lambda n, b, sigma: float(on_off.profiled(n, b, sigma)),
    "z_count": counted,
    "excess_over_sigma": lambda excess, b: float(on_off.excess_over_root(excess + b, b)),
    "two_rates_p": rates,
    "e_test_p": lambda k1, n1, k2, n2: two_rates.estimated_tail((k1, k2), (n1, n2)),
}


@of_topic("on-off")
def test_a_printed_significance(printed: Printed) -> None:
    if printed.name.startswith("two-rates-diff"):
        printed.check(rate_difference(**printed.inputs))
    else:
        printed.check(METHODS[printed.method](**printed.inputs))


def test_a_deficit_is_negative_and_nothing_at_all_is_zero() -> None:
    assert float(on_off.likelihood_ratio(2, 30, 5.0)) < 0.0
    assert float(on_off.profiled(2, 6.0, 1.0)) < 0.0
    assert float(on_off.likelihood_ratio(0, 0, 5.0)) == 0.0
    assert float(on_off.profiled(0, 1.0, 1.0)) < 0.0


def test_no_counts_have_a_tail_of_one() -> None:
    assert float(on_off.known_tail(0, 3.0)) == 1.0
    assert float(on_off.binomial_tail(0, 4, 2.0)) == 1.0


@pytest.mark.parametrize(("n", "b", "sd"), [(4, 1.0, 0.447), (17, 3.8, 0.6), (0, 2.0, 0.5), (3, 40.0, 30.0)])
def test_the_gaussian_average_is_the_integral_of_the_tail(n: int, b: float, sd: float) -> None:
    direct, _ = integrate.quad(
        lambda m: stats.norm.pdf(m, b, sd) * stats.poisson.sf(n - 1, m),
        0.0,
        b + 12.0 * sd,
        points=[b, float(max(n, 1))],
        epsrel=1e-11,
        limit=400,
    )
    assert on_off.gaussian_averaged_tail(n, b, sd) == pytest.approx(direct, rel=1e-8)


@pytest.mark.parametrize(
    ("n", "b", "sd"), [(4, 1.0, 0.447), (0, 2.0, 1.0), (5, 9.0, 4.0), (10**6, 990_000, 2000.0)]
)
def test_the_profiled_background_is_where_the_likelihood_is_largest(n: int, b: float, sd: float) -> None:
    """An independent route: minimise over a grid refined around its best point."""

    def badness(m: Any) -> Any:
        part = n * np.log(n / m) + m - n if n else m
        return 2.0 * part + ((m - b) / sd) ** 2

    low, high = 1e-9, max(n, b) + 10.0 * sd
    for _ in range(30):
        grid = np.linspace(low, high, 201)
        best = int(np.argmin(badness(grid)))
        low, high = grid[max(best - 1, 0)], grid[min(best + 1, 200)]
    assert abs(float(on_off.profiled(n, b, sd))) == pytest.approx(
        np.sqrt(badness(grid[best])), rel=1e-6, abs=1e-6
    )


def test_the_likelihood_ratio_tends_to_the_known_background_for_a_long_control_region() -> None:
    known = np.sqrt(2.0 * (12 * np.log(12 / 5.0) + 5.0 - 12))
    assert float(on_off.likelihood_ratio(12, 5e9, 1e9)) == pytest.approx(known, rel=1e-6)


def test_the_estimated_tail_agrees_with_the_reference_library() -> None:
    for counts, exposures in [((2, 6), (100.0, 100.0)), ((20, 5), (80.0, 50.0)), ((0, 7), (10.0, 12.0))]:
        reference = stats.poisson_means_test(counts[0], exposures[0], counts[1], exposures[1]).pvalue
        assert two_rates.estimated_tail(counts, exposures) == pytest.approx(reference, rel=1e-9)
    assert two_rates.estimated_tail((0, 0), (1.0, 2.0)) == 1.0
