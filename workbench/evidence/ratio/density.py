"""A signal parameter's posterior density, read from the updating ratio under any prior.

p(x | counts) = R(x) prior(x)/B, with R averaged over the priors of the other parameters.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from workbench.evidence.central import CENTRAL, Central
from workbench.evidence.ratio.cells import cells_of
from workbench.evidence.ratio.surface import Surface
from workbench.hypotheses.priors import Fixed, Prior

Array = npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class Density(Central):
    """A posterior density in cells.

    Attributes:
        parameter, unit: whose.
        walls: (cell + 1,) ascending cell ends; two equal ones for a parameter that its prior fixes.
        mass: (cell,) posterior probability of each cell; adds up to 1.
        ln_error: the numerical error of ln R, averaged over the posterior [nats].
    """

    parameter: str
    unit: str
    walls: Array
    mass: Array
    ln_error: float

    @property
    def is_point(self) -> bool:
        """Tell whether the prior fixes the parameter, so that there is no density."""
        return bool(self.walls[-1] <= self.walls[0])

    @property
    def values(self) -> Array:
        """Return (cell,) parameter values in the middle of the cells."""
        return np.asarray(0.5 * (self.walls[1:] + self.walls[:-1]))

    @property
    def density(self) -> Array:
        """Return (cell,) posterior density, averaged over each cell [1/unit]; none where it is a point."""
        if self.is_point:
            return np.zeros(0)
        return np.asarray(self.mass / np.diff(self.walls))

    def below(self, value: float) -> float:
        """Return the posterior probability below a value.

        Args:
            value: of the parameter.
        """
        if self.is_point:
            return float(self.walls[0] < value)
        return float(np.interp(value, self.walls, np.concatenate([[0.0], np.cumsum(self.mass)])))


def posterior_density(surface: Surface, prior: Prior, unit: str) -> Density:
    """Return the posterior density of the only parameter of a surface.

    Args:
        surface: ln R over one parameter, averaged over the others.
        prior: of the parameter, not reaching outside its range.
        unit: of the parameter.

    Returns:
        The density, its median and central interval with numerical errors.

    Source:
        Bayes' theorem. With ln R too large by e below a quantile of level p and too small by e above, p is
        off by 2 p (1 - p) e, which is the largest that an error of e can do.
    """
    (parameter,) = surface.names
    if isinstance(prior, Fixed):
        at, one = np.full(2, prior.value), prior.value
        return Density(one, one, one, 0.0, 0.0, 0.0, parameter, unit, at, np.ones(1), 0.0)
    walls, heights, errors = cells_of(surface, prior)
    weights = np.exp(heights - heights.max())
    mass = weights / weights.sum()
    ln_error = float(mass @ errors)
    quantiles = np.interp(CENTRAL, np.concatenate([[0.0], np.cumsum(mass)]), walls)
    median, low, high = quantiles.tolist()
    cell = np.clip(np.searchsorted(walls, quantiles) - 1, 0, mass.size - 1)
    off = 2.0 * CENTRAL * (1.0 - CENTRAL) * ln_error * np.diff(walls)[cell] / mass[cell]
    of_median, of_low, of_high = off.tolist()
    return Density(median, low, high, of_median, of_low, of_high, parameter, unit, walls, mass, ln_error)
