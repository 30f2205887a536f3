"""The importance-sampling pass: the evidence from draws of the proposal, with its error and k-hat."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from workbench.evidence.integral.lattice import shifted_lattices
from workbench.evidence.integral.pareto import k_hat
from workbench.evidence.integral.proposal import Proposal, propose
from workbench.evidence.integral.quadrature import Grid
from workbench.likelihood.objective import values_at_once

Array = npt.NDArray[np.float64]

SCRAMBLES = 16
# Sixteen scrambles sometimes agree by luck, and drawing stops where the error is small: it may not fall below
# this share of what independent draws would have.
_LEAST_SHARE = 0.3
# Of a heavy tail some is not drawn yet, and mean and spread lack it alike: held against slow references, the
# means lie too low, and up to twice as far off as their spread says.
_HEAVY, _UNSEEN = 0.25, 3.0
_WANTED_ERROR = 0.005
_FIRST_DRAWS, _MOST_DRAWS = 128, 2048
# Where a draw takes this many products, half as many draws are made first; where a pass has taken that many,
# this error is enough.
_DEAR_DRAW, _DEAR_PASS, _WANTED_ERROR_WHEN_DEAR = 3e5, 1e9, 0.02
_LN_2PI = float(np.log(2.0 * np.pi))


@dataclass(frozen=True, slots=True, eq=False)
class Sample:
    """A weighted posterior sample with the evidence that it gives.

    Attributes:
        points: (draw, coordinate) standard coordinates.
        ln_weights: (draw,) ln of integrand over proposal [nats].
        ln_evidence: ln of the mean weight [nats].
        error: one standard error, from the spread of independent scrambles, at least 0.3 of that of
            independent draws, and more where the weights' tail is heavy [nats].
        k_hat: Pareto shape of the largest weights.
    """

    points: Array
    ln_weights: Array
    ln_evidence: float
    error: float
    k_hat: float


def sampled(grid: Grid, seed: np.random.SeedSequence) -> Sample:
    """Return the importance-sampling pass, doubled until its error is small.

    Args:
        grid: the quadrature's nodes.
        seed: where its random numbers come from.

    Returns:
        The weighted sample; its error is at most 0.005 (0.02 where draws are dear) unless the most draws that
        are made did not suffice.
    """
    proposal, effort = propose(grid), grid.integrand.model.effort
    draws = _FIRST_DRAWS if effort < _DEAR_DRAW else _FIRST_DRAWS // 2
    drawn = sample(grid, seed, draws, proposal=proposal)
    while draws < _MOST_DRAWS and drawn.error > _WANTED_ERROR:
        if drawn.error < _WANTED_ERROR_WHEN_DEAR and drawn.ln_weights.size * effort > _DEAR_PASS:
            break
        more = np.random.SeedSequence(seed.entropy, spawn_key=(*seed.spawn_key, draws))
        drawn = sample(grid, more, draws, drawn, proposal)
        draws *= 2
    return drawn


@np.errstate(all="ignore")  # an impossible point has ln weight -inf
def sample(
    grid: Grid,
    seed: np.random.SeedSequence,
    draws_a_scramble: int,
    before: Sample | None = None,
    proposal: Proposal | None = None,
) -> Sample:
    """Return the importance-sampling estimate of the evidence on a grid's proposal.

    Z = mean of L(x) prior(x)/q(x) over draws from q; the error comes from the spread of 16 independently
    randomised point sets.

    Args:
        grid: the quadrature's nodes.
        seed: where the random shifts come from.
        draws_a_scramble: draws in each of the 16 independent scrambles, those from the signal coordinates'
            prior (one for eight) not counted; a power of 2.
        before: draws of the same grid from another seed, which are kept and counted in.
        proposal: what the grid proposes, where it stands already.

    Returns:
        The weighted sample with ln evidence, standard error and k-hat.

    Source:
        Importance sampling: A. Owen, Monte Carlo theory, methods and examples (2013), chapter 9; from memory.
    """
    proposal = propose(grid) if proposal is None else proposal
    model, counts = grid.integrand.model, grid.integrand.counts
    generator = np.random.default_rng(seed)
    points = _drawn(proposal, generator, draws_a_scramble)
    rows = values_at_once(model)
    ln_likelihood = np.concatenate(
        [
            model.ln_likelihood(model.seeds(points[first : first + rows]), counts)
            for first in range(0, len(points), rows)
        ]
    )
    ln_weights = ln_likelihood + _ln_prior(grid, points) - proposal.ln_density(points)
    ln_weights = np.nan_to_num(ln_weights, nan=-np.inf, posinf=-np.inf)
    if before is not None:
        points, ln_weights = _merged(before.points, points), _merged(before.ln_weights, ln_weights)
    return _summary(points, ln_weights)


def _merged(first: Array, second: Array) -> Array:
    """Return two batches of draws as one, scramble after scramble."""
    batches = [batch.reshape(SCRAMBLES, -1, *batch.shape[1:]) for batch in (first, second)]
    return np.concatenate(batches, axis=1).reshape(-1, *first.shape[1:])


def _drawn(proposal: Proposal, generator: np.random.Generator, number: int) -> Array:
    """Return (draw, coordinate) points, scramble after scramble, each with its due share from the prior."""
    sizes = (number, number // 8) if proposal.prior_share else (number,)
    cubes = [
        shifted_lattices(size, proposal.dimensions, SCRAMBLES, generator, proposal.lots) for size in sizes
    ]
    from_prior = np.repeat([False, True][: len(sizes)], sizes)
    cube = np.concatenate(cubes, axis=1)
    return proposal.draw(cube.reshape(-1, cube.shape[-1]), np.tile(from_prior, SCRAMBLES))


def _ln_prior(grid: Grid, points: Array) -> Array:
    """Return (draw,) ln prior density in the measure of the proposal: 1 in outer prior probabilities."""
    inner = grid.integrand.inner
    counted = np.append(grid.integrand.nuisance, [] if inner is None else [inner]).astype(np.intp)
    chosen = points[:, counted]
    return np.asarray(-0.5 * np.einsum("na,na->n", chosen, chosen) - 0.5 * counted.size * _LN_2PI)


def _summary(points: Array, ln_weights: Array) -> Sample:
    top = float(ln_weights.max())
    if not np.isfinite(top):
        return Sample(points, ln_weights, float("-inf"), float("inf"), float("inf"))
    means = np.exp(ln_weights - top).reshape(SCRAMBLES, -1).mean(axis=1)
    mean = float(means.mean())
    spread = float(means.std(ddof=1) / np.sqrt(SCRAMBLES) / mean)
    weights = np.exp(ln_weights - top)
    independent = float(weights.std() / np.sqrt(weights.size) / mean)
    shape = k_hat(ln_weights)
    unseen = 1.0 + _UNSEEN * min(max(shape - _HEAVY, 0.0), 1.0)
    error = unseen * max(spread, _LEAST_SHARE * independent)
    return Sample(points, ln_weights, top + float(np.log(mean)), error, shape)
