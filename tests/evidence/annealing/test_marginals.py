"""Marginals: draws follow the density that is told, and the density follows the points."""

from __future__ import annotations

import numpy as np
from scipy import integrate, stats

from workbench.evidence.annealing.marginals import Marginals, marginals

GENERATOR = np.random.default_rng(41)


def two_bumps() -> Marginals:
    points = np.concatenate([GENERATOR.normal(-2.0, 0.1, (6000, 1)), GENERATOR.normal(1.5, 0.4, (2000, 1))])
    return marginals(points, np.full(len(points), 1.0 / len(points)))


def test_the_density_integrates_to_1_and_peaks_where_the_points_are() -> None:
    found = two_bumps()
    x = np.linspace(-9.0, 9.0, 400_001)
    density = np.exp(found.ln_density(x[:, None])[:, 0])
    assert abs(integrate.trapezoid(density, x) - 1.0) < 1e-3
    inside = np.abs(x + 2.0) < 0.3
    # 0.75 of 0.75 from the points, and what the prior has there.
    expected = 0.75 * 0.75 + 0.25 * (stats.norm.cdf(-1.7) - stats.norm.cdf(-2.3))
    assert abs(integrate.trapezoid(density[inside], x[inside]) - expected) < 0.02


def test_draws_have_the_density_that_is_told() -> None:
    """A histogram of draws against integrals of the density: chi-square over 60 cells."""
    found, count = two_bumps(), 200_000
    drawn = found.drawn(GENERATOR.standard_normal((count, 1)), GENERATOR.random((count, 1)))[:, 0]
    edges = np.linspace(-3.0, 3.0, 61)
    x = np.linspace(-3.0, 3.0, 60 * 2000 + 1)
    density = np.exp(found.ln_density(x[:, None])[:, 0])
    share = integrate.cumulative_trapezoid(density, x, initial=0.0)[::2000]
    expected = np.diff(share) * count
    seen = np.histogram(drawn, edges)[0]
    chi_square = float(((seen - expected) ** 2 / expected).sum())
    assert chi_square < stats.chi2.isf(1e-4, 60)
    # The negative control: another set of points.
    other = marginals(GENERATOR.normal(0.0, 1.0, (5000, 1)), np.full(5000, 1.0 / 5000.0))
    strange = other.drawn(GENERATOR.standard_normal((count, 1)), GENERATOR.random((count, 1)))[:, 0]
    assert float(((np.histogram(strange, edges)[0] - expected) ** 2 / expected).sum()) > 1e4


def test_points_that_all_agree_still_make_a_density() -> None:
    found = marginals(np.full((100, 2), 0.7), np.full(100, 0.01))
    assert np.isfinite(found.ln_density(np.array([[0.7, 0.0], [5.0, -5.0]]))).all()
    assert np.isfinite(found.drawn(np.zeros((10, 2)), np.linspace(0.0, 0.999, 20).reshape(10, 2))).all()
