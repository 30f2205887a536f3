"""Evidences in closed form: counts whose expectation is a sum of independent unknown rates.

Where every expected count is  v_i = c_i0 + sum over rates a of c_ia x_a,  with x_a gamma, exponential,
uniform or known, each observed count is split over its sources in every possible way, and each rate is
integrated in closed form:

    P(n) = sum over splits of
           prod_i [ exp(-c_i0) c_i0^k_i0/k_i0!  prod_a c_ia^k_ia/k_ia! ]  prod_a E[ x_a^K_a exp(-C_a x_a) ]

with K_a = sum_i k_ia and C_a = sum_i c_ia. Known background, gamma background and on/off counting are special
cases.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.hypotheses.priors import Exponential, Gamma, Prior, Uniform
from workbench.likelihood.model import Model

Array = npt.NDArray[np.float64]

_MOST_SPLITS = 500_000


@dataclass(frozen=True, slots=True, eq=False)
class LinearRates:
    """Expected counts that are linear in independent rates.

    Attributes:
        constant: (bin,) events that depend on nothing.
        slopes: (rate, bin) events for each unit of a rate.
        priors: one a rate.
    """

    constant: Array
    slopes: Array
    priors: tuple[Prior, ...]


def linear_rates(model: Model) -> LinearRates | None:
    """Return a hypothesis as linear rates, or None where it is not of that form.

    Args:
        model: a hypothesis.

    Returns:
        Constants, slopes and priors; None with sources, template errors, shapes that move, products of
        parameters or other prior families.
    """
    if model.has_template_errors or any(c.role == "source" for c in model.coordinates):
        return None
    if not all(isinstance(c.prior, Uniform | Gamma | Exponential) for c in model.coordinates):
        return None
    names = set(model.names)
    for part in model.parts:
        process = model.analysis.process(part.process)
        uses = [f for f in process.factors if f in names]
        for contribution in process.regions.values():
            events = contribution.events
            factors = events if isinstance(events, tuple) else (events,)
            uses_here = uses + [f for f in factors if isinstance(f, str) and f in names]
            if set(contribution.parameters) & names - set(uses_here) or len(uses_here) > 1:
                return None
    zero = np.zeros((1, model.size))
    constant = model.expected(model.natural_seeds(zero))[0][0]
    ones = np.eye(model.size)
    slopes = (
        model.expected(model.natural_seeds(ones))[0] - constant if model.size else np.zeros((0, model.bins))
    )
    return LinearRates(constant, slopes, tuple(c.prior for c in model.coordinates))


def ln_moment(prior: Prior, power: Array, damping: float) -> Array:
    """Return ln E[ x^K exp(-C x) ] under a prior.

    Gamma(A, r):      ln Gamma(K + A) - ln Gamma(A) + A ln r - (K + A) ln(r + C)
    uniform(l, h):    ln [ G(K + 1, C h) - G(K + 1, C l) ] + ln K! - (K + 1) ln C - ln(h - l)

    with G the regularised lower incomplete gamma function.

    Args:
        prior: gamma, exponential or uniform.
        power: (...) K; integers >= 0.
        damping: C; >= 0.

    Returns:
        (...) ln expectation [nats].

    Raises:
        TypeError: if the family has no closed form here.

    Source:
        None, integrals of x^K exp(-C x); regularised incomplete gamma function.
    """
    if isinstance(prior, Exponential):
        prior = Gamma(shape=1.0, rate=1.0 / prior.mean)
    if isinstance(prior, Gamma):
        a, r = prior.shape, prior.rate
        return np.asarray(
            special.gammaln(power + a)
            - special.gammaln(a)
            + a * np.log(r)
            - (power + a) * np.log(r + damping)
        )
    if not isinstance(prior, Uniform):
        raise TypeError(f"no closed form under a {prior.family} prior")
    low, high = prior.low, prior.high
    if damping == 0.0:
        return np.asarray(
            np.log(high ** (power + 1.0) - low ** (power + 1.0)) - np.log(power + 1.0) - np.log(high - low)
        )
    below = special.gammainc(power + 1.0, damping * high) - special.gammainc(power + 1.0, damping * low)
    above = special.gammaincc(power + 1.0, damping * low) - special.gammaincc(power + 1.0, damping * high)
    with np.errstate(divide="ignore"):
        mass = np.log(np.where(damping * low > power + 1.0, above, below))
    return np.asarray(
        mass + special.gammaln(power + 1.0) - (power + 1.0) * np.log(damping) - np.log(high - low)
    )


def ln_evidence(rates: LinearRates, counts: Array) -> float | None:
    """Return the exact ln evidence of linear rates; None where splits are too many or digits are lost.

    Args:
        rates: constants, slopes and priors.
        counts: (bin,) observed counts [events].

    Returns:
        ln P(n), the n! included [nats]; -inf where the counts are impossible.

    Source:
        Gamma-Poisson mixtures summed over the ways a count splits over its sources; none, definition.
    """
    splits = [_splits(int(n), sources) for n, sources in zip(counts, _sources(rates), strict=True)]
    if any(split is None for split in splits):
        return None
    if np.prod([float(len(s)) for s in splits if s is not None]) > _MOST_SPLITS:
        return None
    ln_terms, powers = np.zeros(1), np.zeros((1, len(rates.priors)))
    for index, split in enumerate(splits):
        if split is None:
            return None
        weight = np.vstack([rates.constant[None, index], rates.slopes[:, index][:, None]]).ravel()
        with np.errstate(divide="ignore"):
            ln_weight = np.log(weight)
        terms = (special.xlogy(split, weight) - special.gammaln(split + 1.0)).sum(axis=1) - weight[0]
        terms = np.where(((split > 0) & np.isneginf(ln_weight)).any(axis=1), -np.inf, terms)
        ln_terms = (ln_terms[:, None] + terms[None, :]).ravel()
        powers = (powers[:, None, :] + split[None, :, 1:]).reshape(-1, len(rates.priors))
    for slot, prior in enumerate(rates.priors):
        moments = ln_moment(prior, powers[:, slot], float(rates.slopes[slot].sum()))
        if not np.isfinite(moments).all():
            return None
        ln_terms = ln_terms + moments
    return float(special.logsumexp(ln_terms))


def _sources(rates: LinearRates) -> list[npt.NDArray[np.bool_]]:
    """Return for each bin which sources (the constant first) can fill it."""
    table = np.vstack([rates.constant[None, :], rates.slopes]) > 0.0
    return list(table.T)


def _splits(count: int, sources: npt.NDArray[np.bool_]) -> Array | None:
    """Return (split, source) ways to split a count over the sources that can fill the bin."""
    active = np.flatnonzero(sources)
    if active.size == 0:
        return np.zeros((1, sources.size)) if count == 0 else np.array([[count] + [0.0] * (sources.size - 1)])
    ways = special.comb(count + active.size - 1, active.size - 1)
    if ways > _MOST_SPLITS:
        return None
    rows = np.zeros((1, 1))
    left = np.full(1, float(count))
    for _ in range(active.size - 1):
        repeats = (left + 1).astype(int)
        rows = np.repeat(rows, repeats, axis=0)
        taken = np.concatenate([np.arange(r) for r in repeats])
        left = np.repeat(left, repeats) - taken
        rows = np.concatenate([rows, taken[:, None]], axis=1)
    rows = np.concatenate([rows[:, 1:], left[:, None]], axis=1)
    split = np.zeros((len(rows), sources.size))
    split[:, active] = rows
    return split
