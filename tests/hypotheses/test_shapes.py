"""Shapes against quadrature of densities written again here, scipy's distributions, and known limits."""

from __future__ import annotations

from collections.abc import Callable
from itertools import pairwise

import numpy as np
import numpy.typing as npt
import pytest
from scipy import integrate, special, stats

from workbench.counts.binning import Binning
from workbench.hypotheses.jets import Jet
from workbench.hypotheses.shapes import (
    SHAPES,
    AnalyticShape,
    Bernstein,
    BreitWigner,
    CrystalBall,
    Falling,
    Flat,
    Gaussian,
    PowerLaw,
    Template,
    Templates,
    Voigt,
)

Array = npt.NDArray[np.float64]
Density = Callable[[float], float]

GAPS = Binning(
    np.array([20.0, 22.0, 30.0, 41.0, 44.0, 47.5, 60.0]), np.array([22.0, 29.0, 41.0, 44.0, 47.0, 50.0, 80.0])
)
TOUCHING = Binning.from_edges(np.linspace(20.0, 80.0, 31))
LOW, HIGH = 20.0, 80.0


def crystal_ball(
    mean: float, sd: float, tail_low: float, power_low: float, tail_high: float, power_high: float
) -> Density:
    """Return the density, written as one would on paper and normalised by quadrature."""

    def unnormalised(t: float) -> float:
        a, p = (tail_low, power_low) if t < 0 else (tail_high, power_high)
        if abs(t) <= a:
            return float(np.exp(-0.5 * t * t))
        return float((p / a) ** p * np.exp(-0.5 * a * a) * (p / a - a + abs(t)) ** -p)

    corners = [-np.inf, -tail_low, tail_high, np.inf]
    area = sum(integrate.quad(unnormalised, *pair, epsabs=0.0, epsrel=1e-12)[0] for pair in pairwise(corners))
    return lambda x: unnormalised((x - mean) / sd) / (area * sd)


def bernstein(coefficients: list[float]) -> Density:
    """Return the density from binomial coefficients."""
    degree = len(coefficients) - 1
    norm = sum(coefficients) / (degree + 1) * (HIGH - LOW)

    def density(x: float) -> float:
        y = (x - LOW) / (HIGH - LOW)
        terms = (
            c * special.comb(degree, j) * y**j * (1 - y) ** (degree - j) for j, c in enumerate(coefficients)
        )
        return float(sum(terms) / norm)

    return density


def falling(scale: float) -> Density:
    norm = integrate.quad(lambda x: np.exp(-(x - LOW) / scale), LOW, HIGH, epsrel=1e-13)[0]
    return lambda x: float(np.exp(-(x - LOW) / scale) / norm)


def power_law(index: float) -> Density:
    norm = integrate.quad(lambda x: x**-index, LOW, HIGH, epsabs=0.0, epsrel=1e-13)[0]
    return lambda x: float(x**-index / norm)


PEAK = {"mean": 45.3, "sd": 1.7}
BALL = {**PEAK, "tail_low": 1.2, "power_low": 3.0, "tail_high": 1.6, "power_high": 4.5}
ASIDE = {**BALL, "mean": 15.0}
CASES: dict[str, tuple[AnalyticShape, dict[str, float], Density]] = {
    "uniform": (Flat(), {}, lambda x: 1.0 / (HIGH - LOW)),
    "exponential": (Falling("a"), {"scale": 18.0}, falling(18.0)),
    "steep exponential": (Falling("a"), {"scale": 1.5}, falling(1.5)),
    "nearly flat exponential": (Falling("a"), {"scale": 4e3}, falling(4e3)),
    "power law": (PowerLaw("a"), {"index": 3.2}, power_law(3.2)),
    "power law of index 1": (PowerLaw("a"), {"index": 1.0}, power_law(1.0)),
    "rising power law": (PowerLaw("a"), {"index": -2.5}, power_law(-2.5)),
    "bernstein": (
        Bernstein(("a", "b", "c", "d")),
        {"coefficients[0]": 2.0, "coefficients[1]": 0.3, "coefficients[2]": 1.0, "coefficients[3]": 0.7},
        bernstein([2.0, 0.3, 1.0, 0.7]),
    ),
    "gaussian": (Gaussian("a", "b"), PEAK, lambda x: float(stats.norm.pdf(x, 45.3, 1.7))),
    "breitwigner": (
        BreitWigner("a", "b"),
        {"mean": 45.3, "width": 2.6},
        lambda x: float(stats.cauchy.pdf(x, 45.3, 1.3)),
    ),
    "voigt": (
        Voigt("a", "b", "c"),
        {"mean": 45.3, "width": 2.6, "sd": 1.1},
        lambda x: float(special.voigt_profile(x - 45.3, 1.1, 1.3)),
    ),
    "wide voigt": (
        Voigt("a", "b", "c"),
        {"mean": 45.3, "width": 30.0, "sd": 0.8},
        lambda x: float(special.voigt_profile(x - 45.3, 0.8, 15.0)),
    ),
    "crystalball": (CrystalBall(*"abcdef"), BALL, crystal_ball(**BALL)),
    "crystalball off centre": (CrystalBall(*"abcdef"), ASIDE, crystal_ball(**ASIDE)),
}
PEAKS = ("gaussian", "breitwigner", "voigt", "wide voigt", "crystalball", "crystalball off centre")
EACH = pytest.mark.parametrize("name", CASES)


def constants(numbers: dict[str, float], variables: int = 0) -> dict[str, Jet]:
    return {key: Jet.constant(number, variables) for key, number in numbers.items()}


def moving(numbers: dict[str, float], shift: tuple[str, Array] | None = None) -> dict[str, Jet]:
    """Return every number as a variable of its own, over a batch of the shift's size."""
    size = 1 if shift is None else shift[1].size
    jets = {}
    for slot, (key, number) in enumerate(numbers.items()):
        value = np.full(size, number) + (shift[1] if shift is not None and shift[0] == key else 0.0)
        jets[key] = Jet.variable(value, np.ones(size), np.zeros(size), slot, len(numbers))
    return jets


@EACH
@pytest.mark.parametrize("binning", [GAPS, TOUCHING], ids=["gaps", "touching"])
def test_bins_hold_the_integral_of_the_density(name: str, binning: Binning) -> None:
    shape, numbers, density = CASES[name]
    got = shape.integrals(binning, constants(numbers)).value
    corners = [numbers.get("mean", 0.0)]
    if "tail_low" in numbers:
        corners += [
            corners[0] - numbers["tail_low"] * numbers["sd"],
            corners[0] + numbers["tail_high"] * numbers["sd"],
        ]
    for place, (low, high) in enumerate(zip(binning.low, binning.high, strict=True)):
        cuts = [low, *sorted(c for c in corners if low < c < high), high]
        pieces = [
            integrate.quad(density, *pair, epsabs=0.0, epsrel=1e-11, limit=200)[0] for pair in pairwise(cuts)
        ]
        assert got[place] == pytest.approx(sum(pieces), rel=1e-9, abs=1e-14)


@EACH
def test_derivatives_are_those_of_the_integrals(name: str) -> None:
    shape, numbers, _ = CASES[name]
    jet = shape.integrals(GAPS, moving(numbers))
    steps = np.array([-3.0, -2.0, -1.0, 1.0, 2.0, 3.0])
    weights = np.array([-1.0, 9.0, -45.0, 45.0, -9.0, 1.0]) / 60.0
    for slot, (key, number) in enumerate(numbers.items()):
        h = 2e-3 * max(1.0, 0.05 * abs(number))
        near = shape.integrals(GAPS, moving(numbers, (key, h * steps)))
        first = np.tensordot(weights, near.value, (0, 0)) / h
        second = np.tensordot(weights, near.first, (0, 1)) / h
        np.testing.assert_allclose(jet.first[slot, 0], first, atol=2e-10 * max(1.0, np.abs(first).max()))
        np.testing.assert_allclose(jet.second[slot, :, 0], second, atol=2e-9 * max(1.0, np.abs(second).max()))
    np.testing.assert_array_equal(jet.second, np.swapaxes(jet.second, 0, 1))


@EACH
def test_a_number_that_stands_still_changes_no_derivative_of_the_others(name: str) -> None:
    """The shapes skip what does not move; skipping must not change what is left."""
    shape, numbers, _ = CASES[name]
    full = shape.integrals(GAPS, moving(numbers))
    for slot, key in enumerate(numbers):
        arguments = constants(numbers, 1)
        arguments[key] = Jet.variable(np.array([numbers[key]]), np.ones(1), np.zeros(1), 0, 1)
        alone = shape.integrals(GAPS, arguments)
        np.testing.assert_allclose(alone.first[0], full.first[slot], rtol=1e-11, atol=1e-14)
        np.testing.assert_allclose(alone.second[0, 0], full.second[slot, slot], rtol=1e-10, atol=1e-13)


@EACH
def test_values_alone_are_the_same_values_over_any_batch(name: str) -> None:
    shape, numbers, _ = CASES[name]
    with_derivatives = shape.integrals(TOUCHING, moving(numbers)).value[0]
    batch = {key: Jet.constant(np.full((2, 3), number)) for key, number in numbers.items()}
    alone = shape.integrals(TOUCHING, batch)
    assert alone.variables == 0
    np.testing.assert_allclose(alone.value[-1, -1] if numbers else alone.value, with_derivatives, rtol=1e-13)


def test_one_parameter_may_move_two_numbers() -> None:
    """mean = m and sd = 0.04 m: the derivative in m is that along the line."""
    m = Jet.variable(np.array([45.0]), np.ones(1), np.zeros(1), 0, 1)
    jet = Gaussian("m", ("m", 0.04)).integrals(GAPS, {"mean": m, "sd": m * 0.04})

    def at(mass: float) -> Array:
        return np.asarray(np.diff(stats.norm.cdf([GAPS.low, GAPS.high], mass, 0.04 * mass), axis=0)[0])

    h = 0.02
    changes = [at(45.0 + k * h) - at(45.0 - k * h) for k in (1, 2, 3)]
    first = (45.0 * changes[0] - 9.0 * changes[1] + changes[2]) / (60.0 * h)
    sums = [at(45.0 + k * h) + at(45.0 - k * h) for k in (1, 2)]
    second = (16.0 * sums[0] - sums[1] - 30.0 * at(45.0)) / (12.0 * h**2)
    np.testing.assert_allclose(jet.first[0, 0], first, atol=1e-9)
    np.testing.assert_allclose(jet.second[0, 0, 0], second, atol=1e-7)


def test_an_exponential_is_scipys_cut_at_the_range() -> None:
    law = stats.truncexpon(60.0 / 18.0, loc=20.0, scale=18.0)
    got = Falling(1.0).integrals(GAPS, constants({"scale": 18.0})).value
    np.testing.assert_allclose(got, law.cdf(GAPS.high) - law.cdf(GAPS.low), rtol=1e-12)


def test_a_bernstein_basis_polynomial_is_a_beta_law() -> None:
    """The j-th of degree 3 is the beta law with exponents j + 1 and 4 - j."""
    for j in range(4):
        numbers = {f"coefficients[{k}]": float(k == j) for k in range(4)}
        got = Bernstein((1.0, 1.0, 1.0, 1.0)).integrals(GAPS, constants(numbers)).value
        law = stats.beta(j + 1, 4 - j, loc=20.0, scale=60.0)
        np.testing.assert_allclose(got, law.cdf(GAPS.high) - law.cdf(GAPS.low), rtol=1e-10)


def test_only_the_ratios_of_bernstein_coefficients_matter() -> None:
    numbers = {"coefficients[0]": 2.0, "coefficients[1]": 0.3}
    shape = Bernstein((1.0, 1.0))
    once = shape.integrals(GAPS, constants(numbers)).value
    np.testing.assert_allclose(
        shape.integrals(GAPS, constants({k: 7 * v for k, v in numbers.items()})).value, once
    )


def test_continua_fill_the_range_and_peaks_the_line() -> None:
    for name, (shape, numbers, _) in CASES.items():
        wide = Binning.from_edges([-1e9, 45.0, 1e9]) if name in PEAKS else TOUCHING
        assert shape.integrals(wide, constants(numbers)).value.sum() == pytest.approx(1.0, abs=1e-7)


def test_shapes_name_their_quantities_and_bounds() -> None:
    assert Gaussian("mass", 1.2).quantities == {"mean": "mass", "sd": 1.2}
    assert Bernstein((1.0, "c")).quantities == {"coefficients[0]": 1.0, "coefficients[1]": "c"}
    assert Flat().quantities == {}
    assert CrystalBall.lower_bounds["power_low"] == (1.0, True)
    assert Bernstein.lower_bounds["coefficients"] == (0.0, False)


def test_the_families_bear_the_names_of_the_file() -> None:
    assert set(SHAPES) == {
        "uniform", "exponential", "powerlaw", "bernstein", "gaussian", "breitwigner", "voigt", "crystalball",
        "template", "templates",
    }  # fmt: skip
    assert (SHAPES["template"], SHAPES["templates"]) == (Template, Templates)
