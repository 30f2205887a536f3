"""Quasi-random points: inside the cube, even, unbiased, and far better than independent ones."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest

from workbench.evidence.integral.lattice import shifted_lattices

Array = npt.NDArray[np.float64]


def points(number: int, dimensions: int, scrambles: int, seed: int = 5) -> Array:
    return shifted_lattices(number, dimensions, scrambles, np.random.default_rng(seed))


def growth(cube: Array) -> Array:
    """Return a product of exponentials whose integral over the unit cube is exactly 1."""
    rates = 1.0 / np.arange(1, cube.shape[-1] + 1)
    return np.asarray(np.prod(rates * np.exp(rates * cube) / np.expm1(rates), axis=-1))


@pytest.mark.parametrize("dimensions", [1, 3, 32, 33, 50])
def test_points_are_strictly_inside_the_cube(dimensions: int) -> None:
    cube = points(64, dimensions, 4)
    assert cube.shape == (4, 64, dimensions)
    assert cube.min() > 0.0
    assert cube.max() < 1.0


def test_one_seed_gives_one_set_of_points_and_scrambles_differ() -> None:
    assert (points(64, 7, 4) == points(64, 7, 4)).all()
    assert (points(64, 7, 4) != points(64, 7, 4, seed=6)).all()
    cube = points(64, 7, 4)
    assert (cube[0] != cube[1]).all()


@pytest.mark.parametrize("dimension", [0, 1, 5, 31, 40])
def test_every_coordinate_alone_is_spread_evenly(dimension: int) -> None:
    """The n-th of 64 points is one point at most from where it should be; independent ones stray several."""
    cube = np.sort(points(64, 41, 8)[:, :, dimension], axis=1)
    middle = (np.arange(64) + 0.5) / 64
    assert np.abs(cube - middle).max() <= 1.0 / 64 + 1e-9
    independent = np.sort(np.random.default_rng(5).random((8, 64)), axis=1)
    assert np.abs(independent - middle).max() > 3.0 / 64


@pytest.mark.parametrize("dimensions", [2, 6, 40])
def test_the_mean_over_the_points_is_the_integral_within_the_spread_of_the_scrambles(dimensions: int) -> None:
    means = growth(points(256, dimensions, 400)).mean(axis=1)
    error = means.std(ddof=1) / np.sqrt(means.size)
    assert abs(means.mean() - 1.0) < 4.0 * error
    # The negative control: points of half the cube are far off.
    assert abs(growth(0.5 * points(256, dimensions, 400)).mean() - 1.0) > 30.0 * error


@pytest.mark.parametrize(("dimensions", "gain"), [(1, 100.0), (3, 30.0), (8, 8.0)])
def test_smooth_functions_are_integrated_far_better_than_by_independent_points(
    dimensions: int, gain: float
) -> None:
    spread = growth(points(1024, dimensions, 64)).mean(axis=1).std()
    independent = growth(np.random.default_rng(2).random((64, 1024, dimensions))).mean(axis=1).std()
    assert independent / spread > gain


def test_more_points_make_the_error_fall_faster_than_a_root() -> None:
    """Four times the points: independent ones halve the error, a good lattice makes it a quarter or less."""
    few, many = (growth(points(number, 4, 200)).mean(axis=1).std() for number in (256, 1024))
    assert few / many > 3.0
