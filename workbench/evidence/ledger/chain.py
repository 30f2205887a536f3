"""The chain rule along many orders of the bins: what each count adds to ln evidence once others are known."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from workbench.evidence.integral.pareto import k_hat
from workbench.evidence.integral.sampling import SCRAMBLES
from workbench.evidence.ledger.bridge import Bridge

Array = npt.NDArray[np.float64]
Indices = npt.NDArray[np.intp]


@dataclass(frozen=True, slots=True, eq=False)
class Chain:
    """One hypothesis' ln evidence, taken apart along orders of the bins.

    Attributes:
        pairs: (pair, bin) what each bin adds, an order and its reverse averaged [nats].
        shaken: (scramble, bin) what each bin adds on average over all orders, one scramble of the draws left
            out [nats].
        effective: (pass,) the smallest effective number of draws at any step of each pass.
        k_hats: (pass,) the Pareto shape of the weights at that step; -inf where nothing was drawn.
        draws: number of draws.
        is_exact: True for a hypothesis without free coordinates.
    """

    pairs: Array
    shaken: Array
    effective: Array
    k_hats: Array
    draws: int
    is_exact: bool = False

    @property
    def added(self) -> Array:
        """Return (bin,) what each bin adds on average over all orders [nats]."""
        return np.asarray(self.pairs.mean(axis=0))

    @property
    def typical_effective(self) -> float:
        """Return the smallest effective number of draws in a typical pass, half of all having more."""
        return float(np.median(self.effective))


@np.errstate(all="ignore")  # a bin that no draw can fill makes everything -inf, which the caller sees
def chain(bridge: Bridge, orders: Indices) -> Chain:
    """Return what each bin adds to ln evidence, for every order.

    Along an order, with A the bins before bin i:
        ln p(n_i | n_A) = ln p(n_A and n_i) - ln p(n_A),   p(n_A) = E[ prod over A of p(n_j | x) ]
    the expectation over the prior from weighted draws. The sum along an order telescopes to ln p(n), so that
    the shares of every order add up to the same ln evidence, and so do their averages.

    Args:
        bridge: weighted draws that reach from the prior to the posterior.
        orders: (pass, bin) orders, each followed by its reverse.

    Returns:
        The shares of each pair of orders, and what they are without each scramble, for their sampling error.

    Source:
        Chain rule of probability, averaged over orders: L.S. Shapley, A value for n-person games (1953); the
        jackknife over independent groups of draws; from memory.
    """
    bins, passes = bridge.ln_bins.shape[0], len(orders)
    added = np.zeros((passes, bins))
    shaken = np.zeros((SCRAMBLES, bins))
    effective, shapes = np.zeros(passes), np.full(passes, -np.inf)
    for number, order in enumerate(orders):
        walk = _walk(bridge, order)
        added[number, order] = np.diff(walk.ln_whole)
        shaken[:, order] += np.diff(walk.ln_parts, axis=1) / passes
        effective[number] = walk.least_effective
        if not bridge.is_exact:
            shapes[number] = k_hat(walk.ln_worst)
    return Chain(
        added.reshape(-1, 2, bins).mean(axis=1), shaken, effective, shapes, bridge.draws, bridge.is_exact
    )


def sampling_errors(shaken: Array) -> Array:
    """Return (...) standard errors of numbers from (scramble, ...) what they are without each scramble."""
    spread = ((shaken - shaken.mean(axis=0)) ** 2).sum(axis=0)
    return np.asarray(np.sqrt((SCRAMBLES - 1.0) / SCRAMBLES * spread))


@dataclass(frozen=True, slots=True, eq=False)
class _Walk:
    """One order: (step,) ln p of the bins so far, (scramble, step) the same without a scramble, weights."""

    ln_whole: Array
    ln_parts: Array
    least_effective: float
    ln_worst: Array


def _walk(bridge: Bridge, order: Indices) -> _Walk:
    steps = order.size + 1
    sums, tops = np.zeros((steps, SCRAMBLES)), np.zeros(steps)
    ln_weights, weights = bridge.ln_base.copy(), np.empty_like(bridge.ln_base)
    worst, least = ln_weights.copy(), np.inf
    for step in range(steps):
        if step:
            ln_weights += bridge.ln_bins[order[step - 1]]
        tops[step] = ln_weights.max()
        np.exp(np.subtract(ln_weights, tops[step], out=weights), out=weights)  # no array made anew: it counts
        sums[step] = weights.reshape(SCRAMBLES, -1).sum(axis=1)
        effective = sums[step].sum() ** 2 / float(weights @ weights)
        if effective < least:
            least = float(effective)
            worst[:] = ln_weights
    whole = sums.sum(axis=1)
    rest = bridge.draws - bridge.draws // SCRAMBLES
    return _Walk(
        tops + np.log(whole / bridge.draws),
        tops + np.log((whole[None, :] - sums.T) / rest),
        least,
        worst,
    )
