"""Where the integrand lives along the inner strength, as the linear response of the counts foresees it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from workbench.hypotheses.priors import Prior

Array = npt.NDArray[np.float64]
Indices = npt.NDArray[np.intp]

DEEP = 6.0  # nats below its top at which a column may end
_EDGE = 8.3
_FARTHEST = 34.0  # a standard coordinate is a number up to 38


@dataclass(frozen=True, slots=True, eq=False)
class Outlook:
    """What the linear response says about the inner strength, column by column.

    Attributes:
        starts: (column, coordinate) points with nuisance coordinates at the background's mode.
        prior: the strength's prior.
        best, information: (column,) best strength and its inverse variance.
        events: (column,) signal events of a unit of strength.
        absorbed: (column, nuisance) change of the nuisance coordinates that a unit of strength replaces.
    """

    starts: Array
    prior: Prior
    best: Array
    information: Array
    events: Array
    absorbed: Array

    def take(self, rows: Indices) -> Outlook:
        """Return some columns."""
        return Outlook(
            self.starts[rows],
            self.prior,
            self.best[rows],
            self.information[rows],
            self.events[rows],
            self.absorbed[rows],
        )

    def range(self) -> tuple[Array, Array, Array]:
        """Return (column,) ends in standard coordinates that hold the integrand, and the edge.

        The strength is foreseen as if its events were counted in one bin, whose background is such that the
        information is right: a Poisson probability falls less steeply above its top than a parabola.
        """
        low, high = (float(end) for end in self.prior.quantile(np.array([1e-8, 1.0 - 1e-8])))
        if np.isinf(self.prior.support[1]):  # counts may ask for more than the prior had ever expected
            high = float(self.prior.from_standard(_FARTHEST)[0])
        centre = self.prior.to_standard(np.clip(self.best, low, high))
        slope = np.maximum(self.prior.from_standard(centre)[1], 1e-12)
        width = np.clip(1.0 / (np.sqrt(self.information) * slope), 1e-9, 1.0)
        edge = np.maximum(_EDGE, np.abs(centre) + 4.0)
        local = centre[:, None] + width[:, None] * np.linspace(-6.0, 6.0, 61)
        wide = edge[:, None] * np.linspace(-1.0, 1.0, 101)
        t = np.sort(np.clip(np.concatenate([local, wide], axis=1), -edge[:, None], edge[:, None]), axis=1)
        behind = self.events**2 / self.information
        counted = np.maximum(behind + self.best * self.events, 0.0)[:, None]
        mean = behind[:, None] + self.prior.from_standard(t)[0] * self.events[:, None]
        depth = mean - counted * np.log(np.maximum(mean, 1e-300)) + 0.5 * t * t
        depth -= depth.min(axis=1, keepdims=True)
        inside = depth < DEEP + 2.0
        first = np.maximum(np.argmax(inside, axis=1) - 1, 0)
        last = np.minimum(t.shape[1] - np.argmax(inside[:, ::-1], axis=1), t.shape[1] - 1)
        rows = np.arange(len(t))
        return t[rows, first], np.maximum(t[rows, last], t[rows, first] + 1e-9), edge
