"""The monotone cubic through points, with exact derivatives."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from workbench.hypotheses.jets import Derivatives, Jet

Array = npt.NDArray[np.float64]


class Spline:
    """The monotone cubic (PCHIP) through values at several points, one curve for each trailing index.

    Args:
        at: (k,) points, ascending; at least two.
        values: (k, ...) the values there.

    Limits:
        The second derivative jumps at the points. Outside them the last cubic goes on; priors that reach
        there are refused before.

    Source:
        F. N. Fritsch and J. Butland, A method for constructing local monotone piecewise cubic interpolants,
        SIAM J. Sci. Stat. Comput. 5 (1984) 300, as scipy's `PchipInterpolator` has it; from memory.
    """

    __slots__ = ("_at", "_coefficients")

    def __init__(self, at: npt.ArrayLike, values: npt.ArrayLike) -> None:
        from scipy.interpolate import PchipInterpolator  # slow to import, seldom needed

        self._at = np.array(at, dtype=float)
        self._coefficients: Array = PchipInterpolator(self._at, np.array(values, dtype=float), axis=0).c

    def _piece(self, x: Array) -> tuple[Array, tuple[Array, Array, Array, Array]]:
        """Return the distance from the piece's first point, and the cubic's coefficients there."""
        piece = np.clip(np.searchsorted(self._at, x, side="right") - 1, 0, self._at.size - 2)
        cubic, square, linear, constant = (self._coefficients[power][piece] for power in range(4))
        step = (x - self._at[piece]).reshape((*x.shape, *(1,) * (self._coefficients.ndim - 2)))
        return step, (cubic, square, linear, constant)

    def value(self, x: npt.ArrayLike) -> Array:
        """Return the curves at x.

        Args:
            x: (...) where.

        Returns:
            (..., trailing axes of the values) the curves.

        Source:
            That of the class.
        """
        step, (cubic, square, linear, constant) = self._piece(np.asarray(x, dtype=float))
        value: Array = constant + step * (linear + step * (square + step * cubic))
        return value

    def __call__(self, x: npt.ArrayLike) -> Derivatives:
        """Return the curves at x with first and second derivatives.

        Args:
            x: (...) where.

        Returns:
            (..., trailing axes of the values) value, first and second derivative in x.

        Source:
            That of the class.
        """
        step, (cubic, square, linear, constant) = self._piece(np.asarray(x, dtype=float))
        return Derivatives(
            constant + step * (linear + step * (square + step * cubic)),
            linear + step * (2.0 * square + 3.0 * step * cubic),
            2.0 * square + 6.0 * step * cubic,
        )

    def along(self, jet: Jet) -> Jet:
        """Return the curves at a jet, with the jet's variables; no derivatives are made where it has none."""
        if not jet.moves:
            return Jet.constant(self.value(jet.value), jet.variables)
        derivatives = self(jet.value)
        for _ in range(self._coefficients.ndim - 2):
            jet = jet.over_bins()
        return jet.apply(*derivatives)
