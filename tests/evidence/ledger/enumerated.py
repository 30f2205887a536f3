"""Every part of a few counts summed by plain quadrature, with nothing of the engine: what a ledger must say.

Four bins, a background with a log-normal size and a tilt, a signal with an exponential strength.
"""

from __future__ import annotations

from functools import cache
from itertools import combinations, permutations

import numpy as np
import numpy.typing as npt
from scipy import stats

from tests.evidence.small_analyses import several_bins, source, templates
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.priors import Exponential

Array = npt.NDArray[np.float64]

OBSERVED = (14, 26, 9, 5)
BACKGROUND = np.array([10.0, 15.0, 8.0, 6.0])
SIGNAL = np.array([1.0, 6.0, 2.0, 0.5])
SIZE, UP, DOWN, SIGNAL_SIZE = 0.2, np.array([11.0, 15.5, 7.4, 5.0]), np.array([9.0, 14.6, 8.5, 7.1]), 0.2
BINS = 4
NAMES = ("background only", "signal plus background")


def analysis(observed: tuple[int, ...] = OBSERVED) -> Analysis:
    """Return the analysis of the four bins."""
    columns = {"background": BACKGROUND.tolist(), "signal": SIGNAL.tolist()}
    columns |= {"background up": UP.tolist(), "background down": DOWN.tolist()}
    sources = (
        source("size", background=SIZE, signal=SIGNAL_SIZE),
        source("tilt", background=("background up", "background down")),  # type: ignore[arg-type]
    )
    return templates(several_bins("r", observed, columns), Exponential(1.0), sources)


@cache
def _weighted_bins(is_signal: bool, observed: tuple[int, ...], sd: float) -> tuple[Array, Array]:
    """Return (point, bin) probabilities and (point,) prior weights on a product of Gauss-Legendre panels."""
    z, wz = _panels(np.linspace(-8.0, 8.0, 17), 6)
    size, tilt = np.meshgrid(z, z, indexing="ij")
    weights = np.outer(wz * stats.norm.pdf(z, scale=sd), wz * stats.norm.pdf(z)).ravel()
    expected = BACKGROUND * (1.0 + SIZE) ** size.ravel()[:, None] * _tilted(tilt.ravel())
    if is_signal:
        s, ws = _panels(np.array([0.0, 1.0, 2.0, 4.0, 8.0, 16.0, 40.0]), 8)
        level = (1.0 + SIGNAL_SIZE) ** size.ravel()[:, None] * SIGNAL
        expected = (expected[:, None, :] + s[:, None] * level[:, None, :]).reshape(-1, BINS)
        weights = np.outer(weights, ws * np.exp(-s)).ravel()
    return stats.poisson.pmf(np.array(observed), expected), weights


def _tilted(z: Array) -> Array:
    """Return (point, bin) factors of the two-sided variation, as README's "Uncertainties" defines it."""
    u, d = np.log(UP / BACKGROUND), np.log(DOWN / BACKGROUND)
    bend = (np.sqrt(z * z + 1.0 / 16.0) - 0.25) / (np.sqrt(17.0 / 16.0) - 0.25)
    return np.asarray(np.exp(0.5 * (u - d) * z[:, None] + 0.5 * (u + d) * bend[:, None]))


def _panels(ends: Array, nodes: int) -> tuple[Array, Array]:
    x, w = np.polynomial.legendre.leggauss(nodes)
    half = 0.5 * np.diff(ends)
    return (ends[:-1, None] + half[:, None] * (1.0 + x)).ravel(), (half[:, None] * w).ravel()


@cache
def ln_probability(
    name: str, bins: tuple[int, ...], observed: tuple[int, ...] = OBSERVED, sd: float = 1.0
) -> float:
    """Return ln p of the counts of some bins under a hypothesis; `sd` is that of the size's prior."""
    probabilities, weights = _weighted_bins(name == NAMES[1], observed, sd)
    return float(np.log(weights @ np.prod(probabilities[:, list(bins)], axis=1)))


def ln_bayes_factor(bins: tuple[int, ...], observed: tuple[int, ...] = OBSERVED, sd: float = 1.0) -> float:
    """Return ln B of some bins."""
    zero, one = (ln_probability(name, bins, observed, sd) for name in NAMES)
    return one - zero


def added(name: str, order: tuple[int, ...]) -> Array:
    """Return (bin,) what each bin adds to ln evidence along one order."""
    found = np.zeros(BINS)
    for place, index in enumerate(order):
        known = tuple(sorted(order[:place]))
        found[index] = ln_probability(name, tuple(sorted((*known, index)))) - ln_probability(name, known)
    return found


def shares() -> Array:
    """Return (bin,) shares of ln B over all 24 orders."""
    orders = list(permutations(range(BINS)))
    return np.asarray(np.mean([added(NAMES[1], order) - added(NAMES[0], order) for order in orders], axis=0))


def without(bins: tuple[int, ...]) -> float:
    """Return ln B of all bins but some."""
    return ln_bayes_factor(tuple(one for one in range(BINS) if one not in bins))


def subsets() -> list[tuple[int, ...]]:
    """Return every set of bins."""
    return [found for size in range(BINS + 1) for found in combinations(range(BINS), size)]
