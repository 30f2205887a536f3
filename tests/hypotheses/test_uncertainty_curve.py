"""The curve that bends two-sided effects, by hand and against differences."""

from __future__ import annotations

import numpy as np
import pytest

from workbench.hypotheses.uncertainties import curvature

Z = np.linspace(-6.0, 6.0, 241)


def test_it_is_exact_at_minus_one_zero_and_one() -> None:
    assert curvature([-1.0, 0.0, 1.0]).value.tolist() == pytest.approx([1.0, 0.0, 1.0], abs=1e-15)


@pytest.mark.parametrize(("up", "down"), [(0.03, -0.04), (0.5, 0.2), (-0.9, 3.0)])
def test_a_two_sided_factor_is_exact_at_one_sd_and_positive_everywhere(up: float, down: float) -> None:
    """Factor = exp((u - d) z/2 + (u + d) g/2) is 1 + up at 1, 1 + down at -1, 1 at 0."""
    u, d = np.log1p(up), np.log1p(down)

    def factor(z: float) -> float:
        return float(np.exp((u - d) * z / 2.0 + (u + d) * curvature(z).value / 2.0))

    assert factor(1.0) == pytest.approx(1.0 + up, rel=1e-14)
    assert factor(-1.0) == pytest.approx(1.0 + down, rel=1e-14)
    assert factor(0.0) == 1.0
    assert all(factor(z) > 0.0 for z in np.linspace(-8.0, 8.0, 33))


def test_it_is_even_and_grows_like_a_line() -> None:
    """Far out g' = 1/(sqrt(1 + 1/16) - 1/4) = 1.2807764064..., worked by hand."""
    np.testing.assert_allclose(curvature(Z).value, curvature(-Z).value)
    assert float(curvature(1e6).first) == pytest.approx(1.2807764064044151, rel=1e-12)


def test_the_derivatives_are_those_of_the_value() -> None:
    _, first, second = curvature(Z)
    h = 1e-3

    def slope(order: int) -> np.ndarray:
        parts = [curvature(Z + k * h)[order] - curvature(Z - k * h)[order] for k in (1, 2, 3)]
        return np.asarray((45.0 * parts[0] - 9.0 * parts[1] + parts[2]) / (60.0 * h))

    np.testing.assert_allclose(first, slope(0), atol=1e-10)
    np.testing.assert_allclose(second, slope(1), atol=1e-10)


def test_near_zero_it_is_a_parabola_to_the_last_digit() -> None:
    """With z much below 1/4, g = z^2/(2 c)/(sqrt(1 + c^2) - c) = 2 z^2 x 1.2807764064...."""
    assert float(curvature(1e-9).value) == pytest.approx(2e-18 * 1.2807764064044151, rel=1e-14)
