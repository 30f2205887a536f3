"""Where the integrand may live: background at its mode, and the linear response of the counts to a signal."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from workbench.likelihood.model import Model
from workbench.likelihood.newton import maximise
from workbench.likelihood.objective import StandardObjective

Array = npt.NDArray[np.float64]

# The landscape only offers starting points.
_ROUGHLY = 0.05
# A source that moves yields the same way whatever its sign has a saddle at 0, where no step would leave it.
_ASIDE = 0.05


@dataclass(frozen=True, slots=True, eq=False)
class Landscape:
    """The counts around the background's mode.

    Attributes:
        base: (coordinate,) mode with every signal process left out; signal coordinates are 0 there.
        expected: (bin,) expected background events at the base.
        weight: (bin,) 1/variance of a count there.
        residual: (bin,) observed - expected background.
        response: (bin, nuisance) change of the background with the nuisance coordinates.
        stiffness: (nuisance, nuisance) inverse covariance of the nuisance coordinates there.
    """

    base: Array
    expected: Array
    weight: Array
    residual: Array
    response: Array
    stiffness: Array

    def absorbed(self, change: Array) -> Array:
        """Return (batch, nuisance) coordinates that absorb what they can of (batch, bin) weighted changes."""
        return np.asarray(np.linalg.solve(self.stiffness, self.response.T @ (change * self.weight).T).T)

    def project(self, change: Array) -> Array:
        """Return weighted changes with what the nuisance coordinates can absorb taken out, (batch, bin)."""
        return np.asarray((change - self.absorbed(change) @ self.response.T) * self.weight)

    def amplitudes(self, change: Array) -> tuple[Array, Array]:
        """Return how much of each change the residual holds, and its inverse variance.

        Args:
            change: (batch, bin) events that a unit of signal adds.

        Returns:
            (batch,) best amplitude and (batch,) inverse variance; both linear-response estimates.
        """
        projected = self.project(change)
        information = np.maximum(np.einsum("ni,ni->n", projected, change), 1e-300)
        return (projected @ self.residual) / information, information


def survey(model: Model, counts: Array, near: Mapping[str, float]) -> Landscape:
    """Return the background's mode and the linear response around it.

    Args:
        model: a hypothesis.
        counts: (bin,) observed counts [events].
        near: standard coordinates by name to start from; a little beside 0 for those not named.

    Returns:
        The landscape that starting points and node positions are read from; without signal coordinates just
        where it starts.
    """
    start = np.array([0.0 if c.role == "signal" else near.get(c.name, _ASIDE) for c in model.coordinates])
    if model.signal.size == 0:
        nothing = np.zeros(0)
        return Landscape(start, nothing, nothing, nothing, nothing, nothing)
    background = model.restricted("background", spare=True)
    mode = maximise(StandardObjective(background), start[None], counts, tolerance=_ROUGHLY)
    base = mode.points[0]
    nuisance = np.setdiff1d(np.arange(model.size), model.signal)
    seeds = background.seeds(base[None])
    expected, variance = background.expected(seeds)
    spread = expected[0] + (variance[0] if variance is not None else 0.0)
    weight = 1.0 / np.maximum(np.maximum(spread, 0.5), 0.05 * counts)
    response = background.responses(seeds)[0, nuisance].T
    stiffness = (response * weight[:, None]).T @ response + np.eye(nuisance.size)
    return Landscape(base, expected[0], weight, counts - expected[0], response, stiffness)


def signal_events(model: Model, landscape: Landscape, signal_points: Array) -> Array:
    """Return (batch, bin) events that the signal adds at (batch, signal) standard coordinates."""
    points = np.repeat(landscape.base[None], len(signal_points), axis=0)
    points[:, model.signal] = signal_points
    only = model.restricted("signal", spare=False)
    return only.expected(only.seeds(points))[0]
