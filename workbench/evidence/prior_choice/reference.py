"""A prior like the limiting reference prior of a Poisson signal over background, cut off and normalised.

For counts n_i ~ Poisson(s y_i + b_i) with b known, Jeffreys' rule gives the root of the Fisher information,

    density(s) = constant x sqrt( sum over bins of y_i^2/(s y_i + b_i) ),

for one bin 1/sqrt(s + b/y), which is also the limit of the reference prior for a background from a control
region. Its integral to infinity does not exist (it grows like sqrt(s)). An improper prior has no
normalisation, so that a Bayes factor under it would be any number one likes; it is therefore cut off at a
stated strength and normalised, and it is "like" the reference prior only below that.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from workbench.likelihood.model import Model

Array = npt.NDArray[np.float64]

_POINTS = 3000
_SHAPES = 60


@dataclass(frozen=True, slots=True, eq=False)
class ReferenceLike:
    """The density up to a largest strength.

    Attributes:
        high: where it is cut off.
        strengths: (point,) ascending from 0 to at least `high`.
        integral: (point,) integral of the density up to there, not normalised.
    """

    high: float
    strengths: Array
    integral: Array

    @property
    def mean(self) -> float:
        """Return the expectation."""
        inside = np.append(self.strengths[self.strengths < self.high], self.high)
        below = self.below(inside)
        return float(self.high - np.trapezoid(below, inside))

    def below(self, strengths: Array) -> Array:
        """Return the probability below some strengths, (...)."""
        held = np.minimum(strengths, self.high)
        whole = np.interp(self.high, self.strengths, self.integral)
        return np.asarray(np.interp(held, self.strengths, self.integral) / whole)

    def text(self) -> str:
        """Return the prior in words."""
        return f"reference-like, cut off at {self.high:.4g}"


@dataclass(frozen=True, slots=True, eq=False)
class ReferenceFamily:
    """The density without its end.

    Attributes:
        strengths: (point,) ascending from 0.
        integral: (point,) integral of the density up to there.
    """

    strengths: Array
    integral: Array

    def with_mean(self, mean: float) -> ReferenceLike:
        """Return the member whose expectation is given."""
        low, high = mean, float(self.strengths[-1])
        for _ in range(60):
            middle = 0.5 * (low + high)
            if ReferenceLike(middle, self.strengths, self.integral).mean < mean:
                low = middle
            else:
                high = middle
        return ReferenceLike(high, self.strengths, self.integral)


def reference_family(model: Model, strength: str, largest_mean: float) -> ReferenceFamily:
    """Return the density for one strength of a hypothesis, nuisance parameters at their priors' medians.

    The information is averaged over the priors of the signal's other parameters, such as its mass. No
    observed count enters.

    Args:
        model: the compiled hypothesis.
        strength: the parameter's name.
        largest_mean: the largest expectation that a member may be asked for.

    Returns:
        The family; its members exist for expectations up to the given one.

    Source:
        L. Demortier, S. Jain, H.B. Prosper, Reference priors for high energy physics, Phys. Rev. D 82 (2010)
        034002, and D. Casadei, Reference analysis of the signal + background model in counting experiments,
        JINST 7 (2012) P01012, for one count; from memory. Several bins: H. Jeffreys' rule.
    """
    background, events = _events(model, strength)
    top = 4.0 * largest_mean
    strengths = np.concatenate([[0.0], np.geomspace(1e-9 * top, top, _POINTS)])
    # Middles, because with an empty background the density has no end at 0.
    middles = 0.5 * (strengths[1:] + strengths[:-1])
    density = np.sqrt([_information(background, events, float(s)) for s in middles])
    return ReferenceFamily(strengths, np.concatenate([[0.0], np.cumsum(density * np.diff(strengths))]))


def events_of(model: Model, strength: str) -> float:
    """Return the signal events of strength 1, the priors' medians and averages for the rest [events]."""
    return float(_events(model, strength)[1].sum(axis=1).mean())


def first_equal(model: Model, strength: str) -> float:
    """Return the strength at which the signal is as large as the background, in the bin where it first is.

    Args:
        model: the compiled hypothesis, its other parameters at their priors' medians.
        strength: the parameter's name.
    """
    background, events = _events(model, strength)
    some = events > 1e-6 * events.max(initial=0.0)
    if not some.any():
        return 1.0
    ratios = np.broadcast_to(background, events.shape)[some] / events[some]
    return float(max(ratios.min(), 1e-300))


def _information(background: Array, events: Array, strength: float) -> float:
    """Return the Fisher information on a strength, averaged over the (shape, bin) events of signal shapes."""
    expected = background + strength * events
    each = np.where(expected > 0.0, events**2 / np.where(expected > 0.0, expected, 1.0), 0.0)
    return float(each.sum(axis=1).mean())


def _events(model: Model, strength: str) -> tuple[Array, Array]:
    """Return (bin,) other expected events and (shape, bin) events for a unit of strength."""
    place = model.names.index(strength)
    shapes = [index for index in model.signal if not model.coordinates[index].is_strength]
    points = np.repeat(_centre(model)[None], _SHAPES if shapes else 1, axis=0)
    share = (np.arange(len(points)) + 0.5) / len(points)
    for turn, index in enumerate(shapes):
        # Each coordinate runs through its prior in another order, so that a few points cover several.
        order = (share * (1.0, 0.6180339887, 0.7548776662)[min(turn, 2)] * len(points)) % 1.0
        points[:, index] = model.coordinates[index].prior.quantile(share if turn == 0 else order)
    points[:, place] = 0.0
    without = model.expected(model.natural_seeds(points))[0]
    points[:, place] = 1.0
    return without.mean(axis=0), model.expected(model.natural_seeds(points))[0] - without


def _centre(model: Model) -> Array:
    """Return (coordinate,) medians of all priors, 0 for sources."""
    return np.array([0.0 if c.role == "source" else float(c.prior.median) for c in model.coordinates])
