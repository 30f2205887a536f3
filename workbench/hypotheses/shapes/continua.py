"""Shapes without a peak, normalised over the region's range."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import ClassVar

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.counts.binning import Binning
from workbench.hypotheses.jets import Jet, compose
from workbench.hypotheses.quantities import Quantity
from workbench.hypotheses.shapes.family import AnalyticShape, Bounds, edges_of

Array = npt.NDArray[np.float64]

# ln((1 - exp(-u))/u) = -u/2 + sum of B_2n u^(2n) / (2n (2n)!), B the Bernoulli numbers.
_POWERS = np.arange(2, 18, 2)
_LN_SERIES = special.bernoulli(16)[_POWERS] / (_POWERS * special.factorial(_POWERS))
_SLOPE_SERIES = _LN_SERIES * _POWERS
_BEND_SERIES = _SLOPE_SERIES * (_POWERS - 1)
SMALL = 0.5  # the series' first term left out is below 1e-17 there


@dataclass(frozen=True, slots=True)
class Flat(AnalyticShape):
    """The same density everywhere (the file's `uniform`)."""

    family: ClassVar[str] = "uniform"

    def integrals(self, binning: Binning, arguments: Mapping[str, Jet]) -> Jet:
        """Return the part of the range that each bin covers."""
        variables = max((jet.variables for jet in arguments.values()), default=0)
        return Jet.constant((binning.high - binning.low) / (binning.last - binning.first), variables)


@dataclass(frozen=True, slots=True)
class Falling(AnalyticShape):
    """Density ~ exp(-(x - first edge)/scale) (the file's `exponential`).

    Attributes:
        scale: distance over which the density falls to 1/e; > 0.
    """

    family: ClassVar[str] = "exponential"
    lower_bounds: ClassVar[Bounds] = {"scale": (0.0, True)}
    scale: Quantity

    def integrals(self, binning: Binning, arguments: Mapping[str, Jet]) -> Jet:
        """Return the fraction of events in each bin."""
        starts, widths = binning.low - binning.first, binning.high - binning.low
        return _exponential(starts, widths, binning.last - binning.first, arguments["scale"].reciprocal())


@dataclass(frozen=True, slots=True)
class PowerLaw(AnalyticShape):
    """Density ~ x**-index; the first edge is above 0.

    Attributes:
        index: the power, of either sign.
    """

    family: ClassVar[str] = "powerlaw"
    index: Quantity

    def integrals(self, binning: Binning, arguments: Mapping[str, Jet]) -> Jet:
        """Return the fraction of events in each bin: an exponential of rate index - 1 in ln x."""
        starts, widths = np.log(binning.low / binning.first), np.log(binning.high / binning.low)
        return _exponential(
            starts, widths, float(np.log(binning.last / binning.first)), arguments["index"] - 1.0
        )


@dataclass(frozen=True, slots=True)
class Bernstein(AnalyticShape):
    """A polynomial in Bernstein form: coefficients >= 0, of which only the ratios matter.

    Attributes:
        coefficients: as many as the degree plus 1; >= 0, not all 0.
    """

    family: ClassVar[str] = "bernstein"
    lower_bounds: ClassVar[Bounds] = {"coefficients": (0.0, False)}
    coefficients: tuple[Quantity, ...]

    @property
    def quantities(self) -> dict[str, Quantity]:
        """Return the coefficients as "coefficients[0]" and so on."""
        return {f"coefficients[{place}]": one for place, one in enumerate(self.coefficients)}

    def integrals(self, binning: Binning, arguments: Mapping[str, Jet]) -> Jet:
        """Return the fraction of events in each bin.

        With M_ji the integral of the j-th basis polynomial, normalised to 1, over bin i, and S the sum of c:
            p_i = sum_j c_j M_ji / S,      dp/dc_j = (M_j - p)/S,
            d2p/dc_j dc_k = (2 p - M_j - M_k)/S^2

        Source:
            None, definition.
        """
        weights = [arguments[key] for key in self.quantities]
        basis = _bernstein_basis(binning, len(weights))
        total = sum((weight.value for weight in weights), np.zeros(()))[..., None]
        safe = np.maximum(total, 1e-100)
        value = sum(
            (w.value[..., None] / safe * row for w, row in zip(weights, basis, strict=True)), safe * 0.0
        )
        return compose(
            value,
            weights,
            lambda j: (basis[j] - value) / safe,
            lambda j, k: (2.0 * value - basis[j] - basis[k]) / safe**2,
        )


def _bernstein_basis(binning: Binning, number: int) -> Array:
    """Return the (coefficient, bin) integrals of the basis polynomials, each normalised to 1.

    Source:
        The distribution function of a beta law with exponents j + 1 and number - j.
    """
    edges = edges_of(binning)
    y = (edges.values - binning.first) / (binning.last - binning.first)
    j = np.arange(number)[:, None]
    below = edges.differences(special.betainc(j + 1, number - j, y))
    above = -edges.differences(special.betaincc(j + 1, number - j, y))
    middle = 0.5 * (y[edges.low] + y[edges.high])
    return np.where(middle < (j + 1.0) / (number + 1.0), below, above)


def _exponential(starts: Array, widths: Array, length: float, rate: Jet) -> Jet:
    """Return bin fractions of the density exp(-k y) on 0 <= y <= length, for any sign of k.

    With E(u) = (1 - exp(-u))/u:
        p = exp(-k a) (w/L) E(k w)/E(k L),    d ln p/dk = -a + w e(k w) - L e(k L),   e = d ln E/du

    A negative rate is that density seen from the other end.
    """
    if np.ptp(widths) <= 1e-13 * np.max(widths):
        widths = np.mean(widths, keepdims=True)  # equal but for rounding: once instead of bin by bin
    k = np.abs(rate.value)[..., None]
    rising = rate.value[..., None] < 0.0
    begin = starts
    if rising.any():
        begin = np.where(rising, np.maximum(length - starts - widths, 0.0), starts)
    lost_inside, lost_whole = -np.expm1(-k * widths), -np.expm1(-k * length)
    # Where k is 0 both are 0, and the fraction is w/L.
    fraction = np.where(k > 1e-290, lost_inside / np.where(k > 1e-290, lost_whole, 1.0), widths / length)
    value = np.exp(-k * begin) * fraction
    if not rate.moves:
        return Jet.constant(value, rate.variables)
    slope_inside, bend_inside = _ln_decline(k * widths, lost_inside)
    slope_whole, bend_whole = _ln_decline(k * length, lost_whole)
    ln_slope = (widths * slope_inside - length * slope_whole) - begin
    ln_bend = widths**2 * bend_inside - length**2 * bend_whole
    slope = value * (np.where(rising, -ln_slope, ln_slope) if rising.any() else ln_slope)
    return compose(value, (rate,), lambda _: slope, lambda *_: value * (ln_slope**2 + ln_bend))


def _ln_decline(u: Array, lost: Array) -> tuple[Array, Array]:
    """Return first and second derivatives of ln((1 - exp(-u))/u) for u >= 0, given lost = 1 - exp(-u).

        1/(e^u - 1) - 1/u,      1/u^2 - e^u/(e^u - 1)^2

    Source:
        Abramowitz and Stegun, 23.1.1 (generating function of the Bernoulli numbers), for the series near 0;
        from memory.
    """
    small = u < SMALL
    inverse, gain = 1.0 / np.where(small, 1.0, u), 1.0 / np.where(small, 1.0, lost)
    slope, bend = gain - 1.0 - inverse, inverse**2 - gain * (gain - 1.0)
    if small.any():
        near = u[small]
        slope[small] = -0.5 + near * _series(_SLOPE_SERIES, near * near)
        bend[small] = _series(_BEND_SERIES, near * near)
    return slope, bend


def _series(coefficients: Array, x: Array) -> Array:
    """Return the polynomial sum of c_n x^n."""
    total = np.full(x.shape, coefficients[-1])
    for coefficient in coefficients[-2::-1]:
        total *= x
        total += coefficient
    return total
