"""Clouds: draws follow the density that is told, and the density follows the points."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
from scipy import stats

from workbench.evidence.annealing.cloud import Cloud, cloud

Array = npt.NDArray[np.float64]

X = np.linspace(-6.0, 6.0, 601)
CELL = (X[1] - X[0]) ** 2
PLANE = np.stack(np.meshgrid(X, X, indexing="ij"), axis=-1)


def ring() -> Cloud:
    """Return the cloud of a ring of radius 2 in the second and fourth of four coordinates."""
    generator = np.random.default_rng(17)
    angle = generator.uniform(0.0, 2.0 * np.pi, 1024)
    points = generator.standard_normal((1024, 4))
    points[:, 1], points[:, 3] = 2.0 * np.cos(angle), 2.0 * np.sin(angle)
    return cloud(points + 0.05 * generator.standard_normal((1024, 4)), np.array([1, 3]))


def test_the_density_integrates_to_1_and_lies_on_the_points() -> None:
    density = np.exp(ring().ln_density(PLANE))
    assert abs(density.sum() * CELL - 1.0) < 1e-3
    radius = np.hypot(PLANE[..., 0], PLANE[..., 1])
    on_the_ring = density[np.abs(radius - 2.0) < 0.4].sum() * CELL
    # All bells, and what the prior has between these radii.
    prior = stats.chi2.cdf(2.4**2, 2) - stats.chi2.cdf(1.6**2, 2)
    assert abs(on_the_ring - 0.75 - 0.25 * prior) < 0.03


def test_draws_have_the_density_that_is_told() -> None:
    """Moments of draws against sums of the density over the plane."""
    found, count = ring(), 200_000
    generator = np.random.default_rng(18)
    drawn = found.drawn(
        generator.standard_normal((count, 2)), generator.random(count), generator.random(count)
    )
    density = np.exp(found.ln_density(PLANE)) * CELL

    def moments(points: Array, weights: Array) -> Array:
        x, y = points[..., 0], points[..., 1]
        powers = [x, y, x * x, x * y, y * y, (x * x + y * y) ** 2]
        return np.array([(weights * one).sum() for one in powers])

    expected = moments(PLANE, density)
    error = np.sqrt((moments_squared(PLANE, density) - expected**2) / count)
    pull = (moments(drawn, np.full(count, 1.0 / count)) - expected) / error
    assert np.abs(pull).max() < 5.0
    # The negative control: the points themselves, without the prior's share.
    bare = found.drawn(generator.standard_normal((count, 2)), generator.random(count), np.ones(count))
    assert np.abs((moments(bare, np.full(count, 1.0 / count)) - expected) / error).max() > 20.0


def moments_squared(points: Array, weights: Array) -> Array:
    x, y = points[..., 0], points[..., 1]
    powers = [x, y, x * x, x * y, y * y, (x * x + y * y) ** 2]
    return np.array([(weights * one**2).sum() for one in powers])


def test_points_that_all_agree_still_make_a_density() -> None:
    found = cloud(np.full((200, 3), 0.3), np.arange(3))
    assert np.isfinite(found.ln_density(np.array([[0.3, 0.3, 0.3], [9.0, -9.0, 0.0]]))).all()
