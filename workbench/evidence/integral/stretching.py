"""Tails a little heavier than normal, so that importance weights stay bounded."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]

_LARGEST = 0.1
_TOTAL = 0.17
_LN_2PI = float(np.log(2.0 * np.pi))


@dataclass(frozen=True, slots=True)
class Stretch:
    """A map of a normal number z to one with heavier tails, x = c y with z = y/(1 + b y^2)^(1/4).

    Far out z grows as the square root of y only. The scale c = 1 - b/2 keeps the bulk where it was, so that a
    normal target has nearly equal weights: their relative variance is about b^2 a coordinate.

    Attributes:
        b: heaviness; 0 changes nothing.
    """

    b: float

    def forward(self, normal: Array) -> Array:
        """Return (draw, coordinate) stretched numbers from standard-normal ones."""
        square = normal * normal
        bent = self.b * square
        scale = 1.0 - 0.5 * self.b
        return np.asarray(scale * normal * np.sqrt(0.5 * (bent + np.sqrt(bent * bent + 4.0))))

    def ln_density(self, x: Array) -> Array:
        """Return the (draw,) ln density of stretched numbers, coordinates independent [nats].

        dz/dy = (1 + b y^2/2)/(1 + b y^2)^(5/4)
        """
        scale = 1.0 - 0.5 * self.b
        square = np.square(x / scale)
        growth = 1.0 + self.b * square
        root = np.sqrt(growth)
        slope = (0.5 + 0.5 * growth) / (growth * np.sqrt(root) * scale)
        return np.asarray(
            np.log(slope.prod(axis=1)) - 0.5 * (square / root).sum(axis=1) - 0.5 * x.shape[1] * _LN_2PI
        )


def stretch_for(dimensions: int) -> Stretch:
    """Return the stretch for so many coordinates: less in many, where weights multiply."""
    return Stretch(min(_LARGEST, _TOTAL / np.sqrt(max(1, dimensions))))
