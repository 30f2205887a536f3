"""Shares of a Bayes factor that add up to it exactly, from two hypotheses' chains along the same orders.

The chains' draws give a Bayes factor of their own, within its error of the one that stands. What lies between
is given to the bins as far as each one's noise takes part in the noise of the whole: the least squares
adjustment of the shares to their known sum.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from workbench.evidence.ledger.chain import Chain, sampling_errors
from workbench.evidence.ledger.results import Shares, Sum
from workbench.evidence.results import Comparison, largest_gap

Array = npt.NDArray[np.float64]
Flags = npt.NDArray[np.bool_]

_LARGEST_ERROR = 0.1
_FEWEST_EFFECTIVE = 10.0
_MOST_SUMS = 32


@dataclass(frozen=True, slots=True, eq=False)
class Split:
    """A Bayes factor taken apart, bin by bin.

    Attributes:
        pairs: (pair, bin) each bin's weight of evidence, an order and its reverse averaged [nats].
        shaken: (2, scramble, bin) what each bin adds under either hypothesis without each scramble of its
            draws [nats].
        how: how the shares were made and whether they are established.
        leaning: (bin,) each bin's part in the error of the whole; they add up to 1, or all are 0.
    """

    pairs: Array
    shaken: Array
    how: Shares
    leaning: Array

    def share(self, bins: Flags) -> tuple[float, float, float]:
        """Return the share of some bins with its errors from orders and from draws [nats]."""
        pairs = self.pairs[:, bins].sum(axis=1)
        from_orders = float(pairs.std(ddof=1) / np.sqrt(pairs.size)) if pairs.size > 1 else 0.0
        # The shares of everything add up to ln B in whatever order.
        from_orders = 0.0 if bins.all() else from_orders
        from_draws = _sampling_error(self.shaken[:, :, bins].sum(axis=2))
        from_whole = float(self.leaning[bins].sum()) * (self.how.total_error or 0.0)
        return float(pairs.mean()), from_orders, float(np.hypot(from_draws, from_whole))


def split(comparison: Comparison, chain: Chain | None, against: Chain | None) -> Split | None:
    """Return a Bayes factor taken apart.

    The share of bin i is the average over orders of
        ln p(n_i | bins before it, H1) - ln p(n_i | bins before it, H0)

    Args:
        comparison: the Bayes factor.
        chain: the hypothesis' chain.
        against: that of the first hypothesis, along the same orders.

    Returns:
        The split with its diagnosis; None where a chain is missing.

    Source:
        L.S. Shapley, A value for n-person games (1953), with ln B of a set of bins as the worth; from memory.
    """
    if chain is None or against is None:
        return None
    pairs = chain.pairs - against.pairs
    shaken = np.stack([chain.shaken, against.shaken])
    total = float(pairs.mean(axis=0).sum())
    error = _sampling_error(shaken.sum(axis=2))
    drawn = [one for one in (chain, against) if not one.is_exact]
    how = Shares(
        orders=2 * len(pairs),
        total=total,
        total_error=error,
        draws=max((one.draws for one in drawn), default=0),
        effective=min((one.typical_effective for one in drawn), default=None),
        least_effective=min((float(one.effective.min()) for one in drawn), default=None),
        k_hat=max((float(np.median(one.k_hats)) for one in drawn), default=None),
        established=True,
        reason="",
    )
    largest = max(_sampling_error(shaken[:, :, [one]].sum(axis=2)) for one in range(pairs.shape[1]))
    reason = _doubt(how, comparison, largest)
    if reason:
        failed = replace(how, total=None, total_error=None, established=False, reason=reason)
        return Split(pairs, shaken, failed, np.zeros(pairs.shape[1]))
    apart = _settled(pairs, shaken, how, comparison)
    return replace(apart, how=replace(apart.how, rest=_rest(apart)))


def _settled(pairs: Array, shaken: Array, how: Shares, comparison: Comparison) -> Split:
    """Return the split with its shares adjusted to add up to the Bayes factor that stands.

    share_i + (ln B - sum of shares) cov(share_i, sum)/var(sum)

    Source:
        Adjustment of conditioned observations by least squares, C.F. Gauss (1826); from memory.
    """
    value, error = comparison.ln_bayes_factor, comparison.ln_bayes_factor_error
    apart = shaken - shaken.mean(axis=1, keepdims=True)
    wholes = apart.sum(axis=2, keepdims=True)
    variance = float((wholes**2).sum())
    if value is None or how.total is None or variance <= 0.0:
        return Split(pairs, shaken, how, np.zeros(pairs.shape[1]))
    leaning = (apart * wholes).sum(axis=(0, 1)) / variance
    drawn = Sum(how.total, how.total_error or 0.0)
    return Split(
        pairs + (value - how.total) * leaning,
        shaken - wholes * leaning,
        replace(how, total=value, total_error=error, drawn=drawn),
        leaning,
    )


def _rest(apart: Split) -> tuple[Sum, ...]:
    """Return what all bins but the k heaviest add up to."""
    light_first = np.argsort(np.abs(apart.pairs.mean(axis=0)), kind="stable")
    bins, found = light_first.size, []
    for heaviest in range(min(bins, _MOST_SUMS) + 1):
        flags = np.zeros(bins, dtype=bool)
        flags[light_first[: bins - heaviest]] = True
        value, from_orders, from_draws = apart.share(flags)
        found.append(Sum(value, float(np.hypot(from_orders, from_draws))))
    return tuple(found)


def _doubt(how: Shares, comparison: Comparison, largest_error: float) -> str:
    """Return why shares are not established; empty when they are.

    The weights of the draws are bounded, since the prior is among the laws that they were drawn from. Their
    k-hat is told; judged is the number of effective draws, and how far the shares spread.
    """
    value, total, error = comparison.ln_bayes_factor, how.total, how.total_error
    if (
        value is None
        or total is None
        or error is None
        or not np.isfinite([total, error, largest_error]).all()
    ):
        return "no draw can produce the counts of some bins"
    if how.effective is not None and how.effective < _FEWEST_EFFECTIVE:
        return (
            f"half of the orders rest on {how.effective:.0f} effective draws or fewer, "
            f"below {_FEWEST_EFFECTIVE:.0f}"
        )
    if max(error, largest_error) > _LARGEST_ERROR:
        return f"the sampling error of {max(error, largest_error):.2g} is above {_LARGEST_ERROR}"
    limit = largest_gap(error, comparison.ln_bayes_factor_error)
    if abs(total - value) > limit:
        return f"the shares add up to {total:.2f}, ln B is {value:.2f}: they differ by more than {limit:.2g}"
    return ""


def _sampling_error(shaken: Array) -> float:
    """Return one standard error from (hypothesis, scramble) values without each scramble."""
    return float(np.hypot(*(sampling_errors(one) for one in shaken)))
