"""Shapes at their limits: bins far out, shapes that turn into others, extreme numbers."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from workbench.counts.binning import Binning
from workbench.hypotheses.jets import Jet
from workbench.hypotheses.shapes import (
    AnalyticShape,
    Bernstein,
    BreitWigner,
    CrystalBall,
    Falling,
    Flat,
    Gaussian,
    PowerLaw,
    Voigt,
)

TOUCHING = Binning.from_edges(np.linspace(20.0, 80.0, 31))
DECADES = Binning.from_edges([1e-3, 1.0, 10.0, 1e4])
FAR = Binning(np.array([10.0, 30.0, 75.0]), np.array([11.0, 31.0, 76.0]))
PEAK = {"mean": 45.3, "sd": 1.7}


def constants(numbers: dict[str, float]) -> dict[str, Jet]:
    return {key: Jet.constant(number) for key, number in numbers.items()}


def test_gaussian_bins_far_out_keep_their_digits_on_both_sides() -> None:
    """Thirty sd right of the mean and 35 left of it, against scipy.stats on the side without cancellation."""
    got = Gaussian(1.0, 1.0).integrals(FAR, constants({"mean": 45.0, "sd": 1.0})).value
    left = stats.norm.cdf([11.0, 31.0], 45.0, 1.0) - stats.norm.cdf([10.0, 30.0], 45.0, 1.0)
    right = stats.norm.sf(75.0, 45.0, 1.0) - stats.norm.sf(76.0, 45.0, 1.0)
    np.testing.assert_allclose(got, [*left, right], rtol=1e-13)
    assert (got > 0.0).all()


def test_lorentz_bins_far_out_keep_their_digits() -> None:
    """A bin at distance d >> width holds width/(2 pi) (1/d - 1/(d + 1)), but for a part in d^2."""
    far = Binning(np.array([1e6]), np.array([1e6 + 1.0]))
    got = BreitWigner(1.0, 1.0).integrals(far, constants({"mean": 0.0, "width": 2.0})).value
    assert got[0] == pytest.approx(1.0 / (np.pi * 1e6 * (1e6 + 1.0)), rel=1e-11)


def test_a_voigt_peak_of_no_width_is_gaussian_and_of_no_sd_is_lorentz() -> None:
    numbers = {"mean": 45.3, "sd": 1.3}
    gaussian = Gaussian(1.0, 1.0).integrals(TOUCHING, constants(numbers)).value
    narrow = Voigt(1.0, 1.0, 1.0).integrals(TOUCHING, constants({**numbers, "width": 1e-12})).value
    np.testing.assert_allclose(narrow, gaussian, atol=3e-13)
    lorentz = BreitWigner(1.0, 1.0).integrals(TOUCHING, constants({"mean": 45.3, "width": 2.0})).value
    sharp = (
        Voigt(1.0, 1.0, 1.0).integrals(TOUCHING, constants({"mean": 45.3, "width": 2.0, "sd": 1e-6})).value
    )
    np.testing.assert_allclose(sharp, lorentz, rtol=1e-10)


def test_voigt_integrals_are_smooth_where_the_two_series_meet() -> None:
    """One bin is moved across the seam in small steps: second differences stay at rounding level."""
    mean = np.linspace(33.0, 37.0, 4001)
    numbers = {"mean": Jet.constant(mean), "width": Jet.constant(1.0), "sd": Jet.constant(1.0)}
    one_bin = Binning(np.array([46.0]), np.array([48.0]))
    value = Voigt(1.0, 1.0, 1.0).integrals(one_bin, numbers).value[:, 0]
    assert np.abs(np.diff(value, 4)).max() < 5e-15


def test_an_exponential_much_longer_than_the_range_is_flat() -> None:
    flat = Flat().integrals(FAR, {}).value
    np.testing.assert_allclose(
        Falling(1.0).integrals(FAR, constants({"scale": 1e14})).value, flat, rtol=1e-11
    )


def test_crystal_ball_tails_so_far_out_that_nothing_is_there_leave_a_gaussian() -> None:
    numbers = {**PEAK, "tail_low": 9.0, "power_low": 3.0, "tail_high": 9.0, "power_high": 4.5}
    got = CrystalBall(*"abcdef").integrals(TOUCHING, constants(numbers)).value
    gaussian = Gaussian(1.0, 1.0).integrals(TOUCHING, constants(PEAK)).value
    np.testing.assert_allclose(got, gaussian, atol=1e-15)


EXTREMES: dict[AnalyticShape, tuple[str, ...]] = {
    Falling("a"): ("scale",),
    PowerLaw("a"): ("index",),
    Bernstein(("a", "b", "c")): ("coefficients[0]", "coefficients[1]", "coefficients[2]"),
    Gaussian("a", "b"): ("mean", "sd"),
    BreitWigner("a", "b"): ("mean", "width"),
    Voigt("a", "b", "c"): ("mean", "width", "sd"),
    CrystalBall(*"abcdef"): ("mean", "sd", "tail_low", "power_low", "tail_high", "power_high"),
}
RANGES = {
    "mean": [-1e4, 0.0, 20.0, 45.3, 80.0, 1e5],
    "index": [-300.0, -3.0, 0.0, 1.0 - 1e-9, 1.0, 1.0 + 1e-9, 30.0, 300.0],
    "power": [1.0 + 1e-6, 1.5, 4.0, 31.0, 201.0],
    "tail": [1e-3, 0.1, 1.0, 3.0, 8.0],
    "other": [1e-12, 1e-6, 1e-3, 0.1, 1.0, 30.0, 1e3, 1e6, 1e12],
}


@pytest.mark.parametrize("shape", EXTREMES, ids=[shape.family for shape in EXTREMES])
@pytest.mark.parametrize("binning", [TOUCHING, DECADES], ids=["even", "decades"])
def test_extreme_numbers_make_no_nan_no_warning_and_nothing_negative(
    shape: AnalyticShape, binning: Binning
) -> None:
    """A search on the way to its maximum visits such numbers; warnings are errors in these tests."""
    draws, names = np.random.default_rng(20260102), EXTREMES[shape]
    arguments = {}
    for slot, name in enumerate(names):
        value = draws.choice(RANGES.get(name.partition("_")[0], RANGES["other"]), 600)
        arguments[name] = Jet.variable(value, np.ones(600), np.zeros(600), slot, len(names))
    jet = shape.integrals(binning, arguments)
    assert all(np.isfinite(part).all() for part in (jet.value, jet.first, jet.second))
    assert (jet.value >= 0.0).all()
    assert (jet.value.sum(axis=-1) <= 1.0 + 1e-12).all()
