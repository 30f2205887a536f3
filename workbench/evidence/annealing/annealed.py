"""The evidence by annealed populations: for what quadrature cannot lay out and sampling cannot cover.

A scouting run goes from the prior to the posterior and leaves a ladder of rungs. Sixteen independent
populations then climb it; each one's Z is unbiased, so that their mean is the answer and their spread its
error. Rounds of twice as many chains follow until the error is small, each on rungs made by the one before.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.evidence.annealing.exchange import blocks, groups, involutions
from workbench.evidence.annealing.moves import Terrain
from workbench.evidence.annealing.populations import STEPS, Populations, ascend, scout
from workbench.evidence.drawn import Drawn, nothing_drawn, widened
from workbench.evidence.results import largest_gap
from workbench.hypotheses.priors import Beta, Gamma
from workbench.likelihood.model import Model
from workbench.likelihood.objective import values_at_once

Array = npt.NDArray[np.float64]

NAME = "annealing"
POPULATIONS = 16
_FIRST_CHAINS = 64
_FIRST_ROUNDS = 10  # the scout and the first populations take about so many times their draws
_MOST_ROUNDS = 7
_WANTED_ERROR = 0.03
_MOST_EVALUATIONS = 6_000_000
_MOST_WORK = 2e9
_OF_A_QUANTILE = 300  # as much work as so many bins: an incomplete gamma or beta function to invert
_MOST_NUMBERS = 6e7  # held at a time
_ROWS = 2048
_HOPELESS = 0.1
_LARGEST_SPREAD = 0.5
_FAR_AHEAD = 6.0
_LEAST_LEAD = 0.3


@np.errstate(all="ignore")  # an impossible point has ln likelihood -inf
def anneal(
    terrain: Terrain,
    seed: np.random.SeedSequence,
    *,
    most: int = _MOST_EVALUATIONS,
    wanted_error: float = _WANTED_ERROR,
) -> Drawn:
    """Return the integral of a likelihood over a standard normal by annealed populations.

    Args:
        terrain: the likelihood, and what the moves need to know of it.
        seed: where every random number comes from; each population of each round has a child of its own.
        most: evaluations of the likelihood after which nothing new is begun.
        wanted_error: rounds of twice as many chains follow, at least one, until the error is below it.

    Returns:
        ln evidence with the error between populations, their doubt, and the last round's draws.

    Limits:
        A mode that neither the scout nor any population comes upon is not seen: the scout has 65,536 draws
        from the prior, and more chances on its way. A peak at an unknown mass is found with 800 resolution
        elements in the range; a needle in several dimensions at once that nothing leads to is not.

    Source:
        See `populations.ascend`.
    """
    least = _FIRST_ROUNDS * POPULATIONS * _FIRST_CHAINS * STEPS
    if most < least:
        return nothing_drawn(NAME, terrain.size, "too many bins and sources to anneal populations")
    generators = [np.random.default_rng(one) for one in seed.spawn(1 + POPULATIONS * _MOST_ROUNDS)]
    chains = _FIRST_CHAINS
    scouted = scout(terrain, generators.pop(), POPULATIONS * chains, most // 2)
    if not np.isfinite(scouted.ln_evidence).all():
        return nothing_drawn(
            NAME, terrain.size, "no draw can produce the observed counts", scouted.evaluations
        )
    if scouted.beta < 1.0:
        reason = "the way from the prior to the posterior is too long for annealed populations"
        return nothing_drawn(NAME, terrain.size, reason, scouted.evaluations)
    rounds: list[Populations] = []
    rungs, evaluations = scouted.rungs, scouted.evaluations
    for _ in range(_MOST_ROUNDS):
        own = [generators.pop() for _ in range(POPULATIONS)]
        rounds.append(ascend(terrain, rungs, own, chains))
        evaluations += rounds[-1].evaluations
        answer = _answer(rounds, evaluations)
        is_enough = len(rounds) > 1 and answer.error <= wanted_error and not answer.doubt
        # An error falls as the root of the work.
        is_hopeless = len(rounds) > 1 and answer.error * np.sqrt(evaluations / most) > _HOPELESS
        next_states = 2 * max(rounds[-1].points.size, POPULATIONS * chains * terrain.size)
        if (
            is_enough
            or is_hopeless
            or evaluations + 2 * rounds[-1].evaluations > most
            or next_states > _MOST_NUMBERS
        ):
            break
        if np.isfinite(rounds[-1].ln_evidence).any():
            rungs = rounds[-1].rungs
        chains *= 2
    return answer


def terrain_of(model: Model, counts: Array) -> Terrain:
    """Return what annealing needs to know of a hypothesis with at least one coordinate, and its counts."""
    rows = min(_ROWS, values_at_once(model))

    def ln_likelihood(points: Array) -> Array:
        pieces = [
            model.ln_likelihood(model.seeds(points[first : first + rows]), counts)
            for first in range(0, len(points), rows)
        ]
        return np.concatenate(pieces)

    return Terrain(model.size, ln_likelihood, blocks(model), groups(model), involutions(model))


def most_evaluations(model: Model) -> int:
    """Return how many evaluations of a hypothesis keep the waiting to about a quarter of a minute."""
    work = 2 * model.bins
    for part in model.parts:
        sources = 0 if part.by_bin is None else part.by_bin.indices.size
        work += (part.bins.stop - part.bins.start) * (1 + sources)
    work += _OF_A_QUANTILE * sum(isinstance(one.prior, Gamma | Beta) for one in model.coordinates)
    return int(min(_MOST_WORK / work, _MOST_EVALUATIONS))


def _answer(rounds: list[Populations], evaluations: int) -> Drawn:
    """Return the mean over populations and rounds, with the error that their spread gives."""
    each = np.stack([one.ln_evidence for one in rounds])
    share = 2.0 ** np.arange(len(rounds))
    share /= share.sum()
    top = float(each.max())
    if not np.isfinite(top):
        top = 0.0
    relative = np.exp(each - top)
    mean = float(share @ relative.mean(axis=1))
    variance = relative.var(axis=1, ddof=1) / POPULATIONS
    error = widened(POPULATIONS) * float(np.sqrt(share**2 @ variance)) / mean if mean > 0.0 else np.inf
    points = rounds[-1].points
    return Drawn(
        NAME,
        top + float(np.log(mean)),
        error,
        disagreement(each),
        evaluations,
        each[-1],
        points.reshape(-1, points.shape[-1]),
        np.repeat(each[-1], points.shape[1]),
    )


def disagreement(each: Array) -> str:
    """Return why populations don't support each other; empty where they do.

    Args:
        each: (round, population) ln Z.

    Returns:
        The reason: they scatter too much for a mean to be told, some are far ahead of all others (they have
        found what the others missed), or the last two rounds differ by more than their errors allow.
    """
    last = each[-1]
    if not np.isfinite(last).all():
        return "some annealed populations ended where the observed counts are impossible"
    relative = np.exp(last - last.max())
    spread = float(relative.std(ddof=1) / relative.mean())
    if spread > _LARGEST_SPREAD:
        return f"the annealed populations differ by {spread:.2g} of their mean, more than {_LARGEST_SPREAD}"
    middle = float(np.median(last))
    usual = 1.4826 * float(np.median(np.abs(last - middle)))
    ahead = last > middle + max(_FAR_AHEAD * usual, _LEAST_LEAD)
    if ahead.any():
        return f"{ahead.sum()} of {last.size} annealed populations found what the others missed"
    if len(each) > 1:
        means = special.logsumexp(each[-2:], axis=1) - np.log(last.size)
        errors = np.exp(each[-2:] - means[:, None]).std(axis=1, ddof=1) / np.sqrt(last.size)
        gap, limit = abs(float(means[1] - means[0])), largest_gap(*errors)
        if gap > limit:
            return f"two rounds of annealed populations differ by {gap:.2g}, more than {limit:.2g}"
    return ""
