"""Tails a little heavier than normal, so that importance weights stay bounded."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]

_LARGEST = 0.15
_TOTAL = 0.4
_LN_2PI = float(np.log(2.0 * np.pi))


@dataclass(frozen=True, slots=True)
class Stretch:
    """A map of a normal number to one with heavier tails, x = c sinh(asinh(z)/(1 - a)).

    The scale c = 1 - 1.4 a keeps the bulk where it was, so that a normal target has nearly equal weights:
    their relative variance is 0.27 a^2 a coordinate.

    Attributes:
        a: heaviness; 0 changes nothing.

    Source:
        M. Jones, A. Pewsey, Sinh-arcsinh distributions, Biometrika 96 (2009) 761; from memory.
    """

    a: float

    def forward(self, normal: Array) -> Array:
        """Return (draw, coordinate) stretched numbers from standard-normal ones."""
        return np.asarray((1.0 - 1.4 * self.a) * np.sinh(np.arcsinh(normal) / (1.0 - self.a)))

    def ln_density(self, x: Array) -> Array:
        """Return the (draw,) ln density of stretched numbers, coordinates independent [nats]."""
        power, scale = 1.0 - self.a, 1.0 - 1.4 * self.a
        angle = power * np.arcsinh(x / scale)
        normal = np.sinh(angle)
        # dz/dx = (1 - a) cosh(angle)/sqrt(c^2 + x^2), and cosh^2 = 1 + z^2
        slope = 0.5 * np.log((1.0 + normal**2) / (scale**2 + x**2)) + np.log(power)
        return np.asarray((slope - 0.5 * normal**2 - 0.5 * _LN_2PI).sum(axis=1))


def stretch_for(dimensions: int) -> Stretch:
    """Return the stretch for so many coordinates: less in many, where weights multiply."""
    return Stretch(min(_LARGEST, _TOTAL / np.sqrt(max(1, dimensions))))
