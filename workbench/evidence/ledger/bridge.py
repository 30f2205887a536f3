"""Draws that reach from the prior to the posterior, so that any part of the counts can be integrated.

The posterior of a few bins lies near the prior, that of all but a few near the posterior. Draws are taken
from the prior and from the proposals of the likelihood at several powers, and all of them are weighted as
draws of the mixture of all these laws. With the prior among them the weights of all draws are bounded.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.evidence.integral.lattice import shifted_lattices
from workbench.evidence.integral.proposal import Proposal, propose
from workbench.evidence.integral.quadrature import Grid, integrate
from workbench.evidence.integral.sampling import SCRAMBLES, sample
from workbench.evidence.ledger.annealing import annealed
from workbench.likelihood.laws import bin_ln_probability
from workbench.likelihood.model import Model, compile_model
from workbench.likelihood.objective import values_at_once

Array = npt.NDArray[np.float64]

RATIO = 0.4  # of neighbouring powers
_LN_2PI = float(np.log(2.0 * np.pi))


@dataclass(frozen=True, slots=True, eq=False)
class Rungs:
    """The laws that are drawn from, beside the prior.

    Attributes:
        model: the hypothesis.
        counts: (bin,) observed counts [events].
        grid: the quadrature of the whole likelihood.
        proposals: one a power, that of the whole likelihood first.
    """

    model: Model
    counts: Array
    grid: Grid
    proposals: tuple[Proposal, ...]


@dataclass(frozen=True, eq=False)
class Bridge:
    """Weighted draws with what each bin says of each.

    Attributes:
        ln_base: (draw,) ln of prior over mixture, scramble after scramble [nats].
        ln_bins: (bin, draw) ln probability of each bin's count [nats].
        is_exact: True for a hypothesis without free coordinates, whose draws are all the same.
    """

    ln_base: Array
    ln_bins: Array
    is_exact: bool = False

    @property
    def draws(self) -> int:
        """Return the number of draws."""
        return int(self.ln_base.size)

    @cached_property
    def ln_whole(self) -> Array:
        """Return (draw,) ln weights for the whole likelihood [nats]."""
        return np.asarray(self.ln_base + self.ln_bins.sum(axis=0))

    def joined(self, other: Bridge) -> Bridge:
        """Return these draws and as many others, scramble after scramble."""
        bins = len(self.ln_bins)
        base = [one.ln_base.reshape(SCRAMBLES, -1) for one in (self, other)]
        each = [one.ln_bins.reshape(bins, SCRAMBLES, -1) for one in (self, other)]
        return Bridge(
            np.concatenate(base, axis=1).ravel(),
            np.concatenate(each, axis=2).reshape(bins, -1),
            self.is_exact,
        )


def mixed(bridges: Sequence[Bridge], priors: Sequence[float]) -> Bridge:
    """Return the draws of several models as those of their average.

        p(n_A) = sum over models k of P(k) p_k(n_A)

    Args:
        bridges: the draws of each model, over the same bins.
        priors: P(k), adding up to 1.

    Returns:
        All draws, scramble after scramble; the draws themselves where there is only one model.

    Source:
        None, definition.
    """
    if len(bridges) == 1:
        return bridges[0]
    draws = sum(one.draws for one in bridges)
    base = [
        (one.ln_base + np.log(prior * draws / one.draws)).reshape(SCRAMBLES, -1)
        for one, prior in zip(bridges, priors, strict=True)
    ]
    bins = len(bridges[0].ln_bins)
    each = [one.ln_bins.reshape(bins, SCRAMBLES, -1) for one in bridges]
    is_exact = all(one.is_exact for one in bridges)
    return Bridge(
        np.concatenate(base, axis=1).ravel(), np.concatenate(each, axis=2).reshape(bins, -1), is_exact
    )


def powers_for(bins: int) -> tuple[float, ...]:
    """Return the powers of the likelihood, from 1 down to where it says as much as one bin in all of them."""
    powers = [1.0]
    while powers[-1] * bins > 1.0:
        powers.append(powers[-1] * RATIO)
    return tuple(powers)


@np.errstate(all="ignore")
def rungs_of(model: Model, counts: Array) -> Rungs | None:
    """Return the laws to draw from; None where not even that of the whole likelihood can be made."""
    grid = integrate(model, counts)
    if grid is None:
        return None
    try:
        proposals = [propose(grid)]
    except np.linalg.LinAlgError:
        return None
    for power in powers_for(model.bins)[1:]:
        weaker = compile_model(annealed(model.analysis, power), model.hypothesis)
        found = integrate(weaker, power * counts, grid.mode)
        if found is None:
            continue
        try:
            proposals.append(propose(found))
        except np.linalg.LinAlgError:  # the other rungs reach as far, only less evenly
            continue
    return Rungs(model, counts, grid, tuple(proposals))


def exact_bridge(model: Model, counts: Array) -> Bridge:
    """Return the one point of a hypothesis without free coordinates, as often as there are scrambles."""
    points = np.zeros((SCRAMBLES, 0))
    ln_bins = bin_ln_probability(*model.expected(model.seeds(points)), counts).T
    return Bridge(np.zeros(SCRAMBLES), ln_bins, is_exact=True)


@np.errstate(all="ignore")  # an impossible point has ln probability -inf
def bridge(rungs: Rungs, seed: np.random.SeedSequence, draws: int) -> Bridge:
    """Return draws from all rungs and from the prior, weighted as draws of their mixture.

    Args:
        rungs: the laws to draw from.
        seed: where the random shifts come from.
        draws: of each law in each of the independent scrambles; a power of 2.

    Returns:
        The weighted draws.

    Source:
        E. Veach, L. Guibas, Optimally combining sampling techniques (1995), the balance heuristic; A. Owen,
        Y. Zhou, Safe and effective importance sampling, J. Am. Stat. Assoc. 95 (2000) 135; from memory.
    """
    generator = np.random.default_rng(seed)
    model, size = rungs.model, rungs.model.size
    drawn = [
        sample(one.grid, child, draws)
        for one, child in zip(rungs.proposals, seed.spawn(len(rungs.proposals)), strict=True)
    ]
    parts = [one.points.reshape(SCRAMBLES, -1, size) for one in drawn]
    parts.append(special.ndtri(shifted_lattices(draws, size, SCRAMBLES, generator)))
    shares = np.array([part.shape[1] for part in parts], dtype=float)
    points = np.concatenate(parts, axis=1).reshape(-1, size)
    prior = _ln_prior(rungs.grid, points)
    laws = np.array([*(one.ln_density(points) for one in rungs.proposals), prior])
    mixture = special.logsumexp(laws, axis=0, b=(shares / shares.sum())[:, None])
    base = np.nan_to_num(prior - mixture, nan=-np.inf)
    return Bridge(base, _ln_bins(model, points, rungs.counts))


def _ln_prior(grid: Grid, points: Array) -> Array:
    """Return (draw,) ln prior density in the measure of the proposals: 1 in outer prior probabilities."""
    counted = np.delete(points, list(grid.integrand.outer), axis=1)
    return np.asarray(-0.5 * ((counted**2).sum(axis=1) + counted.shape[1] * _LN_2PI))


def _ln_bins(model: Model, points: Array, counts: Array) -> Array:
    """Return (bin, draw) ln probability of each bin's count."""
    rows = values_at_once(model)
    found = np.empty((model.bins, len(points)))
    for first in range(0, len(points), rows):
        seeds = model.seeds(points[first : first + rows])
        found[:, first : first + rows] = bin_ln_probability(*model.expected(seeds), counts).T
    return np.nan_to_num(found, nan=-np.inf, posinf=-np.inf, neginf=-np.inf)
