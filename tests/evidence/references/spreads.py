"""How events spread over bins: integrals of the contract's shapes from their cumulative laws."""

from __future__ import annotations

from collections.abc import Callable, Mapping

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.counts.binning import Binning
from workbench.hypotheses.quantities import Quantity
from workbench.hypotheses.shapes import (
    AnalyticShape,
    Bernstein,
    BreitWigner,
    CrystalBall,
    Falling,
    Flat,
    Gaussian,
    PowerLaw,
)

Array = npt.NDArray[np.float64]
Values = Mapping[str, Array]


def spread(
    shape: AnalyticShape, binning: Binning, values: Values, number: Callable[[Quantity, Values], Array]
) -> Array:
    """Return (row or 1, bin) the fraction of events in each bin.

    Args:
        shape: the shape.
        binning: the bins.
        values: name to (row,) number.
        number: what a quantity stands for at these values, (row,) or (1,).
    """
    low, high = binning.low, binning.high
    start, end = low[0], high[-1]

    def at(quantity: Quantity) -> Array:
        return number(quantity, values)[:, None]

    match shape:
        case Flat():
            return np.asarray((high - low) / (end - start))[None]
        case Falling():
            scale = at(shape.scale)
            inside = np.exp(-(low - start) / scale) - np.exp(-(high - start) / scale)
            return np.asarray(inside / -np.expm1(-(end - start) / scale))
        case PowerLaw():
            power = 1.0 - at(shape.index)
            power = np.where(np.abs(power) < 1e-7, 1e-7, power)
            return np.asarray(
                ((high / start) ** power - (low / start) ** power) / ((end / start) ** power - 1.0)
            )
        case Bernstein():
            return _bernstein([at(one) for one in shape.coefficients], binning)
        case Gaussian():
            mean, sd = at(shape.mean), at(shape.sd)
            return _between(special.ndtr, (low - mean) / sd, (high - mean) / sd)
        case BreitWigner():
            mean, half = at(shape.mean), 0.5 * at(shape.width)
            return np.asarray((np.arctan((high - mean) / half) - np.arctan((low - mean) / half)) / np.pi)
        case CrystalBall():
            return _crystal_ball(shape, binning, at)
    raise TypeError(f"no integrals for {shape}")


def _between(cumulative: Callable[[Array], Array], a: Array, b: Array) -> Array:
    """Return F(b) - F(a) of a symmetric law, from the nearer tail."""
    mirrored = a + b > 0.0
    low, high = np.where(mirrored, -b, a), np.where(mirrored, -a, b)
    return np.asarray(cumulative(high) - cumulative(low))


def _bernstein(coefficients: list[Array], binning: Binning) -> Array:
    """Return the bins' parts of sum c_j B_j: the basis' integrals are incomplete beta functions."""
    degree = len(coefficients) - 1
    start, end = binning.low[0], binning.high[-1]
    a, b = (binning.low - start) / (end - start), (binning.high - start) / (end - start)
    total = sum(coefficients, np.zeros((1, 1)))
    found = np.zeros((1, a.size))
    for j, weight in enumerate(coefficients):
        p, q = j + 1.0, degree - j + 1.0
        found = found + weight / total * (special.betainc(p, q, b) - special.betainc(p, q, a))
    return found


def _crystal_ball(shape: CrystalBall, binning: Binning, at: Callable[[Quantity], Array]) -> Array:
    """Return the bins' parts of a normal core with a power law beyond a on each side.

    From a on, the density is proportional to (p/a)^p exp(-a^2/2) (p/a - a + |t|)^-p; its integral from t to
    infinity is exp(-a^2/2) (p/a)/(p - 1) (a (p/a - a + |t|)/p)^(1 - p).
    """
    mean, sd = at(shape.mean), at(shape.sd)
    sides = [(at(shape.tail_low), at(shape.power_low)), (at(shape.tail_high), at(shape.power_high))]
    root = np.sqrt(2.0 * np.pi)

    def tail(t: Array, a: Array, p: Array) -> Array:
        reach = np.maximum(a * (p / a - a + t) / p, 1.0)
        return np.asarray(np.exp(-0.5 * a * a) * (p / a) / (p - 1.0) * reach ** (1.0 - p))

    (a, p), (b, q) = sides
    core = root * (special.ndtr(b) - special.ndtr(-a))
    whole = tail(a, a, p) + core + tail(b, b, q)

    def cumulative(edge: Array) -> Array:
        t = (edge - mean) / sd
        middle = tail(a, a, p) + root * (special.ndtr(np.clip(t, -a, b)) - special.ndtr(-a))
        upper = tail(a, a, p) + core + tail(b, b, q) - tail(np.maximum(t, b), b, q)
        return np.asarray(np.where(t < -a, tail(np.maximum(-t, a), a, p), np.where(t > b, upper, middle)))

    return np.asarray((cumulative(binning.high) - cumulative(binning.low)) / whole)
