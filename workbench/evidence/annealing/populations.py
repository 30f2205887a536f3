"""Annealed populations: from the prior to the posterior, the power of the likelihood growing from 0 to 1.

In each stage every state of a population is weighted by  L(x)^(change of beta),  the mean weight multiplies
its Z, some states are drawn by their weights, and each starts a chain whose every step is a state of the next
stage. A scouting run finds the rungs of the ladder; with rungs that are given, nothing a population does
depends on itself or on another one, so that its Z has no bias.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from workbench.evidence.annealing.cloud import cloud
from workbench.evidence.annealing.marginals import marginals
from workbench.evidence.annealing.moves import CHOICES, CYCLE, Chains, Dice, Rung, Terrain, adapted, step

Array = npt.NDArray[np.float64]
Indices = npt.NDArray[np.intp]
Generators = list[np.random.Generator]

# Each stage keeps this share of its states' weight: no single one decides much.
_KEPT = 0.7
_HALVINGS = 40
_MOST_STAGES = 500
_MOST_BLOCKS = 8
_STILL_ALIKE = 0.2
STEPS = 2 * len(CYCLE)
_FIRST_SCALES = (0.7, 1.0)
_NUDGE = 1e-6
_ENTRIES = 1024
_SCOUTED = 4  # times as many draws from the prior, for what is narrow


@dataclass(frozen=True, slots=True, eq=False)
class Populations:
    """Populations at the end of a stage.

    Attributes:
        points: (population, state, coordinate) standard coordinates; equally weighted in each population.
        ln_likelihood: (population, state) [nats].
        beta: power of the likelihood that they are drawn at; 1 at the end.
        ln_evidence: (population,) ln Z so far [nats]; -inf where no state can produce the counts.
        rungs: what was found out about each stage's target, for another run.
        evaluations: points at which the likelihood was worked out.
    """

    points: Array
    ln_likelihood: Array
    beta: float
    ln_evidence: Array
    rungs: tuple[Rung, ...]
    evaluations: int


def scout(terrain: Terrain, generator: np.random.Generator, chains: int, most: int) -> Populations:
    """Return one large population that finds its own rungs.

    Args:
        terrain: what is known of the hypothesis.
        generator: where its random numbers come from.
        chains: chains in each stage.
        most: evaluations after which it ends wherever it is.

    Returns:
        The population; its rungs end at beta = 1 unless it was stopped.

    Source:
        As `ascend`; adaptive tempering: A. Jasra, D.A. Stephens, A. Doucet, T. Tsagaris, Scand. J. Stat. 38
        (2011) 1; from memory.
    """
    now = _from_prior(terrain, [generator], _SCOUTED * chains)
    while now.beta < 1.0 and np.isfinite(now.ln_evidence).all():
        if now.evaluations > most or len(now.rungs) >= _MOST_STAGES:
            break
        change = next_change(now.ln_likelihood[0], 1.0 - now.beta)
        beta = 1.0 if change >= 1.0 - now.beta else now.beta + change
        now = _stage(terrain, now, None, beta, [generator], chains)
    return now


def ascend(terrain: Terrain, rungs: tuple[Rung, ...], generators: Generators, chains: int) -> Populations:
    """Return independent populations at the end of their way over given rungs.

    Args:
        terrain: what is known of the hypothesis.
        rungs: what an earlier run found out, the last at beta = 1.
        generators: one a population, which uses no other.
        chains: chains in each stage of each population.

    Returns:
        The populations, with rungs made anew from all of them together.

    Source:
        P. Del Moral, A. Doucet, A. Jasra, J. R. Stat. Soc. B 68 (2006) 411; every step of a chain a state:
        H.-D. Dau, N. Chopin, J. R. Stat. Soc. B 84 (2022) 114; from memory.
    """
    now = _from_prior(terrain, generators, chains)
    for rung in rungs:
        if not np.isfinite(now.ln_evidence).any():
            break
        now = _stage(terrain, now, rung, rung.beta, generators, chains)
    return now


def _from_prior(terrain: Terrain, generators: Generators, chains: int) -> Populations:
    shape = (chains * STEPS, terrain.size)
    points = np.stack([generator.standard_normal(shape) for generator in generators])
    nothing = np.zeros(len(generators))
    return Populations(points, terrain.evaluated(points), 0.0, nothing, (), points[..., 0].size)


def _stage(
    terrain: Terrain, before: Populations, rung: Rung | None, beta: float, generators: Generators, chains: int
) -> Populations:
    """Return the populations one stage further on, by a rung that is given or made of what they are."""
    weights, ln_mean = weighted(before.ln_likelihood, beta - before.beta)
    ln_evidence = before.ln_evidence + ln_mean
    if not np.isfinite(ln_evidence).any():
        return replace(before, ln_evidence=ln_evidence)
    made = _rung(terrain, before, weights, ln_evidence, beta)
    used = made if rung is None else rung
    rows = np.arange(len(weights))[:, None]
    starts = _resampled(weights, chains, generators)
    first = Chains(before.points[rows, starts], before.ln_likelihood[rows, starts])
    states, acceptance, blocks = _moved(terrain, first, used, generators, is_fixed=rung is not None)
    made = replace(made, scales=adapted(used.scales, acceptance), blocks=blocks)
    return Populations(
        states.points,
        states.ln_likelihood,
        beta,
        ln_evidence,
        (*before.rungs, made),
        before.evaluations + states.ln_likelihood.size,
    )


def next_change(ln_likelihood: Array, left: float) -> float:
    """Return how far the power of the likelihood may grow in one step.

    The effective number of states, with w = L^change,
        N = (sum w)^2 / sum w^2
    stays at 0.7 of those that can produce the counts at all.

    Args:
        ln_likelihood: (state,) [nats].
        left: how far it is to 1.

    Returns:
        The change, at most what is left.

    Source:
        L. Kish (1965) for the effective number; from memory.
    """
    finite = ln_likelihood[np.isfinite(ln_likelihood)]
    below = finite - finite.max() if finite.size else np.zeros(1)
    wanted = _KEPT * below.size
    low, high = 0.0, left
    if _effective(below * high) >= wanted:
        return left
    for _ in range(_HALVINGS):
        # By large factors first: likelihoods may differ by 1e9 nats.
        middle = float(np.sqrt(low * high)) if low > 0.0 else 0.03 * high
        low, high = (middle, high) if _effective(below * middle) >= wanted else (low, middle)
        if low > 0.99 * high:
            break
    return low if low > 0.0 else high


def _effective(ln_weights: Array) -> float:
    weights = np.exp(ln_weights)
    return float(weights.sum() ** 2 / (weights**2).sum())


def weighted(ln_likelihood: Array, change: float) -> tuple[Array, Array]:
    """Return (population, state) weights adding up to 1 in each population, and each one's ln mean weight."""
    ln_weights = np.where(np.isfinite(ln_likelihood), ln_likelihood * change, -np.inf)
    top = ln_weights.max(axis=1, keepdims=True)
    weights = np.where(np.isfinite(top), np.exp(ln_weights - top), 1.0)
    total = weights.sum(axis=1, keepdims=True)
    return weights / total, top[:, 0] + np.log(total[:, 0] / weights.shape[1])


def _resampled(weights: Array, number: int, generators: Generators) -> Indices:
    """Return (population, number) states drawn by their weights, at even steps from one random start."""
    found = []
    for row, generator in zip(weights, generators, strict=True):
        steps = (np.arange(number) + generator.random()) / number
        found.append(np.minimum(np.searchsorted(np.cumsum(row), steps), row.size - 1))
    return np.stack(found)


def _rung(terrain: Terrain, before: Populations, weights: Array, ln_evidence: Array, beta: float) -> Rung:
    """Return what all populations together say about the target at the next power, each by its own Z."""
    share = np.exp(ln_evidence - ln_evidence.max())
    pooled = (weights * share[:, None] / share.sum()).ravel()
    points = before.points.reshape(-1, before.points.shape[-1])
    mean = pooled @ points
    off = points - mean
    covariance = (off * pooled[:, None]).T @ off
    spread = np.maximum(np.diag(covariance), 1e-20)
    root = np.linalg.cholesky(covariance + np.diag(_NUDGE * spread))
    steps = (np.arange(_ENTRIES) + 0.5) / _ENTRIES
    chosen = np.minimum(np.searchsorted(np.cumsum(pooled), steps), pooled.size - 1)
    scales = before.rungs[-1].scales if before.rungs else _FIRST_SCALES
    archive, own = points[chosen], marginals(points, pooled)
    clouds = tuple(cloud(archive, group) for group in terrain.groups)
    return Rung(beta, mean, root, np.linalg.inv(root), archive, own, clouds, scales, 1)


def _moved(
    terrain: Terrain, first: Chains, rung: Rung, generators: Generators, *, is_fixed: bool
) -> tuple[Chains, dict[str, float], int]:
    """Return every state of the chains, the acceptance of each kind of move, and the cycles made.

    Without a fixed number of cycles, chains move on until their ends have forgotten their beginnings.
    """
    chains, states, acceptance = first, [], defaultdict(list)
    blocks = 0
    while blocks < (rung.blocks if is_fixed else _MOST_BLOCKS):
        for kind, dice in _dice(chains.points.shape, generators, 2 * blocks):
            chains, accepted = step(kind, chains, dice, rung, terrain)
            states.append(chains)
            acceptance[kind].append(accepted)
        blocks += 1
        if not is_fixed and _alikeness(first, chains) < _STILL_ALIKE:
            break
    everything = Chains(
        np.concatenate([one.points for one in states], axis=1),
        np.concatenate([one.ln_likelihood for one in states], axis=1),
    )
    return everything, {kind: float(np.mean(each)) for kind, each in acceptance.items()}, blocks


def _dice(shape: tuple[int, ...], generators: Generators, cycles: int) -> Iterator[tuple[str, Dice]]:
    """Yield the kind and the random numbers of each step of a block."""
    _, chains, size = shape
    for place in range(STEPS):
        normal = np.stack([one.standard_normal((chains, size)) for one in generators])
        uniform = np.stack([one.random((chains, size + CHOICES)) for one in generators])
        turn, which = divmod(place, len(CYCLE))
        yield CYCLE[which], Dice(normal, uniform[..., :size], uniform[..., size:], cycles + turn)


def _alikeness(first: Chains, last: Chains) -> float:
    """Return the largest correlation, over coordinates and ln L, of where chains began and where they are."""
    began, ended = (
        np.concatenate([one.points[0], one.ln_likelihood[0][:, None]], axis=1) for one in (first, last)
    )
    began, ended = began - began.mean(axis=0), ended - ended.mean(axis=0)
    size = np.sqrt((began**2).sum(axis=0) * (ended**2).sum(axis=0))
    return float(((began * ended).sum(axis=0) / np.maximum(size, 1e-300)).max())
