"""Evidences of densities that others use to try their integrators on.

These densities are no counts, so the engine itself can't be asked. What can: the quasi-random points that its
sampling pass is made of, in two and three dimensions, with the error from the spread of their scrambles; and
dynesty, the nested sampler that other tests hold the engine against. Where many dimensions make a thin shell,
the printed value is checked by its radial integral alone, so that it is known to be right for who needs it.
"""

from __future__ import annotations

from collections.abc import Callable

import dynesty
import numpy as np
import numpy.typing as npt
import pytest
from scipy import integrate, special

from tests.published.printed import Printed, of_topic
from workbench.evidence.integral.lattice import shifted_lattices

Array = npt.NDArray[np.float64]


def ln_shells(points: Array) -> Array:
    """Two shells of radius 2 and width 0.1, centred at -3.5 and +3.5 on the first axis."""
    parts = []
    for centre in (-3.5, 3.5):
        offset = np.array(points, dtype=float)
        offset[..., 0] -= centre
        radius = np.sqrt((offset**2).sum(axis=-1))
        parts.append(-0.5 * ((radius - 2.0) / 0.1) ** 2 - 0.5 * np.log(2.0 * np.pi * 0.1**2))
    return np.asarray(np.logaddexp(*parts))


def ln_rosenbrock(points: Array) -> Array:
    x, y = points[..., 0], points[..., 1]
    return np.asarray(-((1.0 - x) ** 2) - 100.0 * (y - x**2) ** 2)


def ln_correlated_normal(points: Array) -> Array:
    """Unit variances, correlations 0.95, normalised."""
    covariance = np.full((3, 3), 0.95) + 0.05 * np.eye(3)
    inverse, determinant = np.linalg.inv(covariance), np.linalg.det(covariance)
    square = np.einsum("...a,ab,...b->...", points, inverse, points)
    return np.asarray(-0.5 * square - 0.5 * np.log((2.0 * np.pi) ** 3 * determinant))


DENSITIES: dict[str, tuple[Callable[[Array], Array], int, float]] = {
    "shells-2": (ln_shells, 2, 6.0),
    "rosenbrock": (ln_rosenbrock, 2, 5.0),
    "correlated-normal": (ln_correlated_normal, 3, 10.0),
}


@of_topic("evidence", *DENSITIES)
def test_quasi_random_points_reach_the_printed_evidence(printed: Printed) -> None:
    density, dimensions, half_width = DENSITIES[printed.name]
    cubes = shifted_lattices(1 << 15, dimensions, 48, np.random.default_rng(20240701))
    means = np.exp(density(half_width * (2.0 * cubes - 1.0))).mean(axis=1)
    error = means.std(ddof=1) / np.sqrt(means.size) / means.mean()
    assert printed.recomputed is not None
    assert error < 0.05
    # The box cuts 1e-8 of the shells off, which the recomputation over all radii does not.
    assert abs(np.log(means.mean()) - printed.recomputed) < 4.0 * error + 1e-7
    assert abs(np.log(means.mean()) - printed.value) < printed.precision + 4.0 * error


def test_points_that_miss_one_shell_are_told_apart() -> None:
    """The negative control: half of the evidence missing is many errors away."""
    cubes = shifted_lattices(1 << 15, 2, 16, np.random.default_rng(20240701))
    points = 6.0 * (2.0 * cubes - 1.0)
    means = np.where(points[..., 0] > 0.0, np.exp(ln_shells(points)), 0.0).mean(axis=1)
    error = means.std(ddof=1) / np.sqrt(means.size) / means.mean()
    assert abs(np.log(means.mean()) + 1.7456) > 20.0 * error


@of_topic("evidence", "shells")
def test_the_printed_evidence_of_the_shells_is_their_radial_integral(printed: Printed) -> None:
    """ln [ 2 S (1/12)^D integral of r^(D-1) normal(r; 2, 0.1) dr ], S the surface of the unit sphere."""
    d = printed.inputs["dim"]
    surface = np.log(2.0) + 0.5 * d * np.log(np.pi) - special.gammaln(0.5 * d)

    def ln_density(r: float) -> float:
        return float((d - 1.0) * np.log(r) - 0.5 * ((r - 2.0) / 0.1) ** 2 - 0.5 * np.log(2.0 * np.pi * 0.01))

    # d/dr = 0: (d - 1)/r = (r - 2)/0.01
    peak = 1.0 + np.sqrt(1.0 + 0.01 * (d - 1.0))
    value, _ = integrate.quad(
        lambda r: np.exp(ln_density(r) - ln_density(peak)), 0.5, 4.0, points=[peak], epsrel=1e-12, limit=200
    )
    printed.check(float(np.log(2.0) + surface - d * np.log(12.0) + np.log(value) + ln_density(peak)))


@pytest.mark.slow
@of_topic("evidence", *DENSITIES)
def test_the_nested_sampler_used_as_a_reference_reaches_the_printed_evidence(printed: Printed) -> None:
    density, dimensions, half_width = DENSITIES[printed.name]
    sampler = dynesty.NestedSampler(
        lambda point: float(density(np.asarray(point))),
        lambda cube: half_width * (2.0 * cube - 1.0),
        dimensions,
        nlive=150,
        bound="multi",
        sample="rwalk",
        rstate=np.random.default_rng(7),
    )
    sampler.run_nested(print_progress=False, dlogz=0.1)
    found, error = float(sampler.results.logz[-1]), float(sampler.results.logzerr[-1])
    assert error < 0.4
    assert abs(found - printed.value) < printed.precision + 4.0 * error
