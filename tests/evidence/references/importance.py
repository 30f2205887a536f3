"""Long importance sampling from a mixture that was fitted to the posterior in several rounds."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy import special
from scipy.stats import qmc

from tests.evidence.references.mixture import Mixture, fitted, started
from tests.evidence.references.population import carried

Array = npt.NDArray[np.float64]
LnLikelihood = Callable[[Array], Array]

REPEATS = 32  # independently scrambled sequences, whose spread is the error
_ROUNDS = (6_000, 12_000, 24_000, 24_000)
_MORE_ROUNDS = (40_000, 40_000, 40_000)
_EVEN_ENOUGH = 0.6
_LN_2PI = float(np.log(2.0 * np.pi))


@dataclass(frozen=True)
class Reference:
    """A reference evidence.

    Attributes:
        ln_evidence: ln of the mean weight [nats].
        error: one standard error [nats].
        method: how it was made.
        evaluations: how many points the likelihood was evaluated at.
        effective: share of the draws that even weights would need for the same spread.
    """

    ln_evidence: float
    error: float
    method: str
    evaluations: int
    effective: float = 1.0


def sampled(
    ln_likelihood: LnLikelihood, size: int, seed: int | tuple[int, ...], wanted: float, most: int
) -> Reference:
    """Return the ln evidence over a standard-normal prior by importance sampling.

    Args:
        ln_likelihood: (row, dimension) standard-normal coordinates to (row,) ln likelihood.
        size: number of dimensions.
        seed: where the random numbers come from.
        wanted: the error to stop at [nats].
        most: at most how many draws.

    Source:
        Population Monte Carlo: O. Cappe et al., Stat. Comput. 18 (2008) 447; from memory.
    """
    rng = np.random.default_rng(seed)
    mixture = _proposal(ln_likelihood, size, rng).guarded()
    sequences = [qmc.Sobol(size + 1, rng=child) for child in rng.spawn(REPEATS)]
    totals, squares, drawn, number = np.full(REPEATS, -np.inf), -np.inf, 0, 1024
    while True:
        for place, sequence in enumerate(sequences):
            ln_weights = _ln_weights(ln_likelihood, mixture, mixture.draw(sequence.random(number)))
            totals[place] = np.logaddexp(totals[place], special.logsumexp(ln_weights))
            squares = float(np.logaddexp(squares, special.logsumexp(2.0 * ln_weights)))
        drawn += number
        number = drawn
        whole = float(special.logsumexp(totals))
        means = np.exp(totals - totals.max())
        spread = float(means.std(ddof=1) / np.sqrt(REPEATS) / means.mean())
        effective = float(np.exp(2.0 * whole - squares)) / (REPEATS * drawn)
        independent = float(np.sqrt(max(1.0 / effective - 1.0, 0.0) / (REPEATS * drawn)))
        error = max(spread, 0.1 * independent)
        if error <= wanted or 2 * drawn * REPEATS > most:
            break
    return Reference(whole - float(np.log(REPEATS * drawn)), error, "sampling", REPEATS * drawn, effective)


def _proposal(ln_likelihood: LnLikelihood, size: int, rng: np.random.Generator) -> Mixture:
    """Return a mixture fitted to the population, then to weighted draws of itself, round after round.

    Where draws remain uneven, the last rounds are done again with three times as many parts.
    """
    points = carried(ln_likelihood, size, rng)
    weights = np.ones(len(points))
    parts = 16 if size <= 4 else 10 if size <= 8 else 6 if size <= 16 else 4
    mixture = fitted(points, weights, started(points, weights, parts, rng))
    for number in _ROUNDS:
        mixture, points, weights = _refitted(ln_likelihood, mixture, number, rng)
    even = float(weights.sum() ** 2 / (weights**2).sum() / weights.size)
    if even < _EVEN_ENOUGH:
        mixture = fitted(points, weights, started(points, weights, 3 * parts, rng), 12)
        for number in _MORE_ROUNDS:
            mixture, points, weights = _refitted(ln_likelihood, mixture, number, rng)
    return mixture


def _refitted(
    ln_likelihood: LnLikelihood, mixture: Mixture, number: int, rng: np.random.Generator
) -> tuple[Mixture, Array, Array]:
    """Return a mixture fitted to weighted draws of another, the draws and their weights."""
    wide = mixture.guarded(0.2, 0.05)
    points = wide.draw(rng.random((number, mixture.means.shape[1] + 1)))
    ln_weights = _ln_weights(ln_likelihood, wide, points)
    weights = np.exp(ln_weights - ln_weights.max())
    # A few large weights would pull the fit to themselves; the estimate itself never cuts them.
    weights = np.minimum(weights, np.sqrt(number) * weights.mean())
    return fitted(points, weights, mixture), points, weights


def _ln_weights(ln_likelihood: LnLikelihood, mixture: Mixture, points: Array) -> Array:
    prior = -0.5 * np.einsum("na,na->n", points, points) - 0.5 * points.shape[1] * _LN_2PI
    values = ln_likelihood(points) + prior - mixture.ln_density(points)
    return np.asarray(np.nan_to_num(values, nan=-np.inf, posinf=-np.inf))
