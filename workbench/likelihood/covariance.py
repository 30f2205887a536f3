"""How far the data let each parameter move: the inverse of the exact second derivatives."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from workbench.likelihood.objective import FitObjective

Array = npt.NDArray[np.float64]
Flags = npt.NDArray[np.bool_]

LIMIT_SHARE = 1e-4
_FLAT = 1e-6
_IN_A_FLAT_DIRECTION = 0.01
_LARGEST = 1e150  # beyond it, and with nan, there is no inverse


@dataclass(frozen=True, slots=True, eq=False)
class Spread:
    """What the second derivatives at the best point say.

    Attributes:
        covariance: (coordinate, coordinate) of the parameters; 0 in rows that have no error.
        at_limit: (coordinate,) True where the value is at an end of its range.
        pressed: (coordinate,) True where it would go on beyond that end if it could.
        flat: (coordinate,) True where the data leave a direction free that the coordinate is part of.
    """

    covariance: Array
    at_limit: Flags
    pressed: Flags
    flat: Flags

    @property
    def has_error(self) -> Flags:
        """Return (coordinate,) True where an error from the second derivatives means something."""
        return np.diag(self.covariance) > 0.0

    @property
    def errors(self) -> Array:
        """Return (coordinate,) standard deviations; 0 where there is none."""
        return np.sqrt(np.diag(self.covariance))

    @property
    def correlations(self) -> Array:
        """Return (coordinate, coordinate) correlations; 0 where there is no error."""
        norm = np.where(self.has_error, self.errors, np.inf)
        return np.asarray(self.covariance / np.outer(norm, norm))


def spread(objective: FitObjective, best: Array, counts: Array, scale: Array) -> Spread:
    """Return the covariance at the best point, and what has no part in it.

    Parameters pressed against an end of their range are held there. Directions along which the scaled second
    derivatives vanish are flat: whatever has a share in them gets no error.

    Args:
        objective: what the fit maximised.
        best: (coordinate,) best point.
        counts: (bin,) counted events [events].
        scale: (coordinate,) a length for each coordinate.

    Returns:
        The covariance with flags for limits and flat directions.

    Limits:
        Errors from second derivatives suppose a parabola; the asymmetric ones do not.
    """
    _, gradients, hessians = objective.derivatives(best[None], counts)
    gradient, curvature = gradients[0], -hessians[0]
    near_low = best - objective.low <= LIMIT_SHARE * scale
    near_high = objective.high - best <= LIMIT_SHARE * scale
    pressed = (near_low & (gradient < 0.0)) | (near_high & (gradient > 0.0))
    covariance, flat = np.zeros_like(curvature), np.zeros(best.size, dtype=bool)
    free = np.flatnonzero(~pressed)
    unit = scale[free]
    scaled = curvature[np.ix_(free, free)] * np.outer(unit, unit)
    if free.size and (np.abs(scaled) <= _LARGEST).all():
        values, vectors = np.linalg.eigh(scaled)
        weak = values < _FLAT * max(1.0, float(np.abs(values).max()) * _FLAT)
        flat[free] = (vectors[:, weak] ** 2).sum(axis=1) > _IN_A_FLAT_DIRECTION
        firm = np.flatnonzero(~flat[free])
        inverse = (vectors[:, ~weak] / values[~weak]) @ vectors[:, ~weak].T
        sure = free[firm]
        found = inverse[np.ix_(firm, firm)] * np.outer(unit[firm], unit[firm])
        covariance[np.ix_(sure, sure)] = found if np.isfinite(found).all() else 0.0
    return Spread(covariance, near_low | near_high, pressed, flat)
