"""The Voigt peak: a Lorentz peak smeared by a normal one.

With q = sd sqrt(2) and z = (x - mean + i width/2)/q the density is Re w(z)/(q sqrt(pi)), w the Faddeeva
function, so that the distribution function is 1/2 + Re W(z)/sqrt(pi) with W' = w. No quadrature is needed:
near the centre Weideman's series of w is integrated term by term, far away the asymptotic series.
"""

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
from workbench.hypotheses.shapes.family import AnalyticShape, Bounds, Edges, edges_of, from_tails

Array = npt.NDArray[np.float64]
Complex = npt.NDArray[np.complex128]

ROOT_PI = float(np.sqrt(np.pi))
ROOT_TWO = float(np.sqrt(2.0))
FAR = 64.0  # |z|^2 from which the asymptotic series reaches double precision
TERMS = 40  # of Weideman's series: 2e-15 everywhere in the upper half plane
STRETCH = float(np.sqrt(TERMS / np.sqrt(2.0)))


def _near_coefficients() -> Array:
    """Return a_n/n of Weideman's series, n from 0.

    Source:
        J. A. C. Weideman, Computation of the complex error function, SIAM J. Numer. Anal. 31 (1994) 1497,
        eqs. 31 to 37, from memory; the tests compare with scipy's wofz.
    """
    half = 2 * TERMS
    angle = np.arange(-half + 1, half) * np.pi / half
    t = STRETCH * np.tan(0.5 * angle)
    samples = np.append(0.0, np.exp(-t * t) * (STRETCH**2 + t * t))
    a = np.real(np.fft.fft(np.fft.fftshift(samples))) / (2 * half)
    a[1 : TERMS + 1] /= np.arange(1, TERMS + 1)
    a[0] = 0.0
    return np.asarray(a[: TERMS + 1])


_NEAR = _near_coefficients()
_ORDERS = np.arange(15)
_FAR = special.factorial2(2 * _ORDERS - 1, exact=False) / 2.0**_ORDERS  # w = i/(z sqrt(pi)) sum of d_k z^-2k
_FAR[0] = 1.0
_FAR_SLOPE = _FAR * (2 * _ORDERS + 1)
_FAR_TAIL = np.append(0.0, _FAR[1:] / (2 * _ORDERS[1:]))


@dataclass(frozen=True, slots=True)
class Voigt(AnalyticShape):
    """A Lorentz peak of a full width, smeared by a normal one of a standard deviation.

    Attributes:
        mean: its centre.
        width: full width at half maximum of the Lorentz peak; > 0.
        sd: standard deviation of the smearing; > 0.
    """

    family: ClassVar[str] = "voigt"
    lower_bounds: ClassVar[Bounds] = {"width": (0.0, True), "sd": (0.0, True)}
    mean: Quantity
    width: Quantity
    sd: Quantity

    def integrals(self, binning: Binning, arguments: Mapping[str, Jet]) -> Jet:
        """Return the fraction of events in each bin."""
        edges, mean, sd = edges_of(binning), arguments["mean"], arguments["sd"]
        half = arguments["width"] * 0.5
        q = ROOT_TWO * sd.value[..., None]
        z = (edges.values - mean.value[..., None]) / q + 1j * (half.value[..., None] / q)
        value = np.maximum(from_tails(edges, z.real, _tail(z)), 0.0)
        moving = (mean, half, sd)
        if not any(jet.moves for jet in moving):
            return Jet.constant(value, max(jet.variables for jet in moving))
        return _with_derivatives(edges, value, z, q, moving)


def _with_derivatives(
    edges: Edges, value: Array, z: Complex, q: Array, arguments: tuple[Jet, Jet, Jet]
) -> Jet:
    """Return the integrals as a jet in mean, half width and sd.

    With dz/dmean = -1/q, dz/dhalf = i/q, dz/dsd = -z/sd:
        dF = Re(w dz)/sqrt(pi),      d2F = Re(w' dz dz + w d2z)/sqrt(pi)
    """
    w, tilt = _faddeeva(z)
    scale = (-1.0 / q, 1j / q, -ROOT_TWO / q)

    def slope(k: int) -> Array:
        moved = w * z if k == 2 else w
        return edges.differences(np.real(scale[k] * moved)) / ROOT_PI

    def bend(k: int, n: int) -> Array:
        if n < 2:
            moved = tilt
        elif k < 2:
            moved = w + z * tilt
        else:
            moved = z * (2.0 * w + z * tilt)
        return edges.differences(np.real(scale[k] * scale[n] * moved)) / ROOT_PI

    return compose(value, arguments, slope, bend)


def _tail(z: Complex) -> Array:
    """Return the part of a Voigt density beyond |Re z|."""
    mirrored = np.abs(z.real) + 1j * z.imag
    far = z.real**2 + z.imag**2 > FAR
    tail = np.empty(z.shape)
    outer, inner = mirrored[far], mirrored[~far]
    tail[far] = (np.angle(outer) - _horner(_FAR_TAIL, outer**-2).imag) / np.pi
    series = _horner(_NEAR, (STRETCH + 1j * inner) / (STRETCH - 1j * inner)).imag / STRETCH
    angle = np.arctan2(inner.real, STRETCH + inner.imag)
    tail[~far] = 0.5 - series / ROOT_PI - angle / np.pi
    return tail


def _faddeeva(z: Complex) -> tuple[Complex, Complex]:
    """Return w(z) and w'(z) = 2i/sqrt(pi) - 2 z w(z), far away without its cancellation."""
    far = z.real**2 + z.imag**2 > FAR
    w, tilt = np.empty(z.shape, dtype=complex), np.empty(z.shape, dtype=complex)
    outer, inner = z[far], z[~far]
    square = outer**-2
    w[far] = 1j / ROOT_PI / outer * _horner(_FAR, square)
    tilt[far] = -1j / ROOT_PI * square * _horner(_FAR_SLOPE, square)
    w[~far] = special.wofz(inner)
    tilt[~far] = 2j / ROOT_PI - 2.0 * inner * w[~far]
    return w, tilt


def _horner(coefficients: Array, z: Complex) -> Complex:
    """Return the polynomial sum of c_n z^n."""
    total = np.full(z.shape, coefficients[-1], dtype=complex)
    for coefficient in coefficients[-2::-1]:
        total *= z
        total += coefficient
    return total
