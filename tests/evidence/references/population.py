"""A population of points carried from the prior to the posterior, step by step, to find where it lives."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import numpy.typing as npt
from scipy import optimize

Array = npt.NDArray[np.float64]
LnLikelihood = Callable[[Array], Array]

KEPT = 0.5  # effective share of the population that a step may leave


def carried(
    ln_likelihood: LnLikelihood, size: int, rng: np.random.Generator, members: int = 2000, moves: int = 6
) -> Array:
    """Return (member, dimension) points of the posterior, roughly.

    Likelihoods are raised to powers from 0 to 1; the population is resampled and moved at each. Nothing that
    follows relies on its being exact: it says where to draw from.

    Args:
        ln_likelihood: (row, dimension) standard-normal coordinates to (row,) ln likelihood.
        size: number of dimensions.
        rng: where the random numbers come from.
        members: how many points.
        moves: how many moves a power.

    Source:
        P. Del Moral, A. Doucet, A. Jasra, Sequential Monte Carlo samplers, J. R. Stat. Soc. B 68 (2006) 411.
        Moves along differences of members: C.J.F. ter Braak, Stat. Comput. 16 (2006) 239. Both from memory.
    """
    points = rng.normal(size=(8 * members, size))
    values = ln_likelihood(points)
    power, scale, first = 0.0, 1.0, True
    while power < 1.0:
        step = _step(values, power)
        weights = np.exp(step * (values - values.max()))
        chosen = _resampled(weights, members, rng)
        points, values = points[chosen], values[chosen]
        power = 1.0 if step >= 1.0 - power else power + step
        for _ in range(2 * moves if first or power == 1.0 else moves):
            points, values, accepted = _moved(ln_likelihood, points, values, power, scale, rng)
            scale = float(np.clip(scale * np.exp(accepted - 0.25), 0.05, 2.0))
        first = False
    return points


def _step(values: Array, power: float) -> float:
    """Return how far the power may rise before the weights become too uneven."""

    def left(step: float) -> float:
        weights = np.exp(step * (values - values.max()))
        return float(weights.sum() ** 2 / (weights**2).sum() / weights.size - (KEPT if power else 0.1))

    if left(1.0 - power) > 0.0:
        return 1.0 - power
    return float(optimize.brentq(left, 0.0, 1.0 - power, xtol=1e-12))


def _resampled(weights: Array, members: int, rng: np.random.Generator) -> npt.NDArray[np.intp]:
    ends = np.cumsum(weights)
    places = np.searchsorted(ends, (np.arange(members) + rng.random()) / members * ends[-1])
    return np.asarray(np.minimum(places, weights.size - 1))


def _moved(
    ln_likelihood: LnLikelihood,
    points: Array,
    values: Array,
    power: float,
    scale: float,
    rng: np.random.Generator,
) -> tuple[Array, Array, float]:
    """Return the members after one move along the difference of two others, and the accepted share."""
    members, size = points.shape
    first, second = rng.permutation(members), rng.permutation(members)
    reach = np.where(rng.random(members) < 0.1, 1.0, scale * 2.38 / np.sqrt(2.0 * size))
    proposed = points + reach[:, None] * (points[first] - points[second])
    proposed = proposed + 1e-4 * rng.normal(size=points.shape)
    heights = ln_likelihood(proposed)
    gain = power * (heights - values) + 0.5 * (points**2 - proposed**2).sum(axis=1)
    taken = np.log(rng.random(members)) < gain
    points = np.where(taken[:, None], proposed, points)
    return points, np.where(taken, heights, values), float(taken.mean())
