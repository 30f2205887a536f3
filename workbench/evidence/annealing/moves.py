"""Moves of annealed populations: Metropolis steps of many chains at once, at one power of the likelihood.

The target is  L(x)^beta N(x; 0, 1)  in standard-normal coordinates x. Every move leaves it as it is, given a
rung: what an earlier run found out about this target.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from workbench.evidence.annealing.cloud import Cloud
from workbench.evidence.annealing.exchange import Involutions
from workbench.evidence.annealing.marginals import Marginals

Array = npt.NDArray[np.float64]
Flags = npt.NDArray[np.bool_]
Indices = npt.NDArray[np.intp]
LnLikelihood = Callable[[Array], Array]

# In the order of a block's steps.
CYCLE = ("follow", "stride", "redraw", "visit", "leap", "follow", "redraw", "fold")
CHOICES = 4
_WANTED_ACCEPTANCE = {"follow": 0.4, "stride": 0.25}
_SMALLEST, _LARGEST = 1e-3, 0.98
_JITTER = 0.05


@dataclass(frozen=True, slots=True, eq=False)
class Rung:
    """One power of the likelihood, with what is known of its target.

    Attributes:
        beta: power of the likelihood.
        mean: (coordinate,).
        root: (coordinate, coordinate) lower Cholesky factor of the covariance.
        inverse: (coordinate, coordinate) its inverse.
        archive: (entry, coordinate) points of the target.
        marginals: each coordinate's own distribution.
        clouds: joint distributions of a few coordinates each.
        scales: sizes of the moves "follow" and "stride".
        blocks: how many cycles of moves a chain makes.
    """

    beta: float
    mean: Array
    root: Array
    inverse: Array
    archive: Array
    marginals: Marginals
    clouds: tuple[Cloud, ...]
    scales: tuple[float, float]
    blocks: int


@dataclass(frozen=True, slots=True, eq=False)
class Chains:
    """Where the chains of each population stand.

    Attributes:
        points: (population, chain, coordinate) standard coordinates.
        ln_likelihood: (population, chain) [nats].
    """

    points: Array
    ln_likelihood: Array


@dataclass(frozen=True, slots=True, eq=False)
class Dice:
    """The random numbers of one step, drawn by each population's own generator.

    Attributes:
        normal, uniform: (population, chain, coordinate) for proposals.
        choices: (population, chain, 4) uniform numbers for choices; the last one decides.
        turn: counts the cycles.
    """

    normal: Array
    uniform: Array
    choices: Array
    turn: int


@dataclass(frozen=True, slots=True, eq=False)
class Terrain:
    """What moves need to know of the hypothesis.

    Attributes:
        size: number of coordinates.
        ln_likelihood: (batch, coordinate) points to (batch,) ln likelihood.
        blocks: (block, coordinate) True for the coordinates that a leap or a redraw changes together.
        groups: coordinates that are visited together.
        involutions: maps that are their own inverse and keep the prior.
    """

    size: int
    ln_likelihood: LnLikelihood
    blocks: Flags
    groups: tuple[Indices, ...]
    involutions: Involutions

    def evaluated(self, points: Array) -> Array:
        """Return (...,) ln likelihood at (..., coordinate) points, -inf where it is no number."""
        found = self.ln_likelihood(points.reshape(-1, self.size)).reshape(points.shape[:-1])
        return np.where(np.isnan(found), -np.inf, found)


def step(kind: str, chains: Chains, dice: Dice, rung: Rung, terrain: Terrain) -> tuple[Chains, float]:
    """Return the chains after one Metropolis step, and the share of accepted proposals.

    Args:
        kind: "follow" turns a chain part of the way towards a fresh draw of the normal law with the target's
            mean and covariance; "stride" adds a multiple of the difference of two points of the archive;
            "leap" the whole difference, in one block of coordinates; "redraw" draws one block anew, each
            coordinate from its marginal; "visit" draws one group anew from its cloud; "fold" exchanges two
            signals or mirrors a coordinate.
        chains: where the chains stand.
        dice: random numbers.
        rung: the target.
        terrain: what is known of the hypothesis.

    Returns:
        The chains, and the share.

    Source:
        "follow": S.L. Cotter, G.O. Roberts, A.M. Stuart, D. White, Stat. Sci. 28 (2013) 424, about a fitted
        normal law; differences: C.J.F. ter Braak, Stat. Comput. 16 (2006) 239; from memory.
    """
    proposed, ln_back_and_forth = _PROPOSALS[kind](chains.points, dice, rung, terrain)
    before, after = chains.ln_likelihood, terrain.evaluated(proposed)
    ln_prior = 0.5 * (_square(chains.points) - _square(proposed))
    gain = rung.beta * (after - before) + ln_prior + ln_back_and_forth
    accepted = np.log(np.maximum(dice.choices[..., -1], 1e-300)) < gain
    points = np.where(accepted[..., None], proposed, chains.points)
    return Chains(points, np.where(accepted, after, before)), float(accepted.mean())


def _square(points: Array) -> Array:
    return np.asarray(np.einsum("pca,pca->pc", points, points))


def _follow(points: Array, dice: Dice, rung: Rung, _: Terrain) -> tuple[Array, Array]:
    share = rung.scales[0]
    before = (points - rung.mean) @ rung.inverse.T
    after = np.sqrt(1.0 - share**2) * before + share * dice.normal
    return rung.mean + after @ rung.root.T, 0.5 * (_square(after) - _square(before))


def _stride(points: Array, dice: Dice, rung: Rung, terrain: Terrain) -> tuple[Array, Array]:
    gamma = rung.scales[1] * 2.38 / np.sqrt(2.0 * terrain.size)
    jitter = _JITTER / np.sqrt(terrain.size) * dice.normal @ rung.root.T
    return points + gamma * _differences(dice, rung) + jitter, np.zeros(points.shape[:2])


def _leap(points: Array, dice: Dice, rung: Rung, terrain: Terrain) -> tuple[Array, Array]:
    chosen = _one_of(terrain.blocks, dice)
    return points + np.where(chosen, _differences(dice, rung), 0.0), np.zeros(points.shape[:2])


def _redraw(points: Array, dice: Dice, rung: Rung, terrain: Terrain) -> tuple[Array, Array]:
    chosen = _one_of(terrain.blocks, dice)
    proposed = np.where(chosen, rung.marginals.drawn(dice.normal, dice.uniform), points)
    ratio = rung.marginals.ln_density(points) - rung.marginals.ln_density(proposed)
    return proposed, np.where(chosen, ratio, 0.0).sum(axis=-1)


def _visit(points: Array, dice: Dice, rung: Rung, terrain: Terrain) -> tuple[Array, Array]:
    if not rung.clouds:
        return _stride(points, dice, rung, terrain)
    cloud = rung.clouds[dice.turn % len(rung.clouds)]
    here, proposed = points[..., cloud.coordinates], points.copy()
    there = cloud.drawn(dice.normal[..., cloud.coordinates], dice.choices[..., 0], dice.choices[..., 1])
    proposed[..., cloud.coordinates] = there
    return proposed, cloud.ln_density(here) - cloud.ln_density(there)


def _fold(points: Array, dice: Dice, _: Rung, terrain: Terrain) -> tuple[Array, Array]:
    return terrain.involutions.applied(points, dice.choices[..., 2]), np.zeros(points.shape[:2])


_PROPOSALS = {
    "follow": _follow,
    "stride": _stride,
    "leap": _leap,
    "redraw": _redraw,
    "visit": _visit,
    "fold": _fold,
}


def _differences(dice: Dice, rung: Rung) -> Array:
    """Return (population, chain, coordinate) differences of two different entries of the archive."""
    entries = len(rung.archive)
    first = (dice.choices[..., 0] * entries).astype(np.intp)
    second = (first + 1 + (dice.choices[..., 1] * (entries - 1)).astype(np.intp)) % entries
    return np.asarray(rung.archive[first] - rung.archive[second])


def _one_of(blocks: Flags, dice: Dice) -> Flags:
    """Return (population, chain, coordinate) flags of one block for each chain."""
    return np.asarray(blocks[(dice.choices[..., 2] * len(blocks)).astype(np.intp)])


def adapted(scales: tuple[float, float], acceptance: dict[str, float]) -> tuple[float, float]:
    """Return sizes of the moves "follow" and "stride" after what was accepted with these."""
    follow, stride = (
        scale * float(np.exp(2.0 * (acceptance.get(kind, wanted) - wanted)))
        for scale, (kind, wanted) in zip(scales, _WANTED_ACCEPTANCE.items(), strict=True)
    )
    return min(max(follow, _SMALLEST), _LARGEST), min(max(stride, _SMALLEST), 2.0)
