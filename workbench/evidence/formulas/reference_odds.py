"""Bayes factors of small counting problems with priors that the literature settled on."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.evidence.formulas.count_mixtures import ln_upper_gamma
from workbench.likelihood.laws import half_deviance, stirling_error

Array = npt.NDArray[np.float64]


def ln_on_off_jeffreys(n_on: int, n_off: int, alpha: float) -> float:
    """Return ln B01 of on/off counts under Jeffreys priors, scaled so that no counts leave the odds at 1.

    With N = n_on + n_off and I the regularised incomplete beta function:
        B01 = 2 arctan(1/sqrt(alpha))/sqrt(pi) alpha^n_on (1 + alpha)^-N Gamma(N + 1/2)/Gamma(N + 1)
              / [ B(n_off + 1/2, n_on + 1/2) I(n_off + 1/2, n_on + 1/2; 1/(1 + alpha)) ]

    Args:
        n_on: counts where the signal would be [events].
        n_off: counts in the control region [events].
        alpha: ratio of on to off exposure; > 0.

    Returns:
        ln B01 [nats], background only against background plus signal.

    Source:
        M.L. Knoetig, Astrophys. J. 790 (2014) 106, equations for P(H0 | n_on, n_off, alpha), from memory; his
        hypergeometric function is written as the incomplete beta function, which is stable for any alpha.
    """
    total = n_on + n_off
    a, b = n_off + 0.5, n_on + 0.5
    share = special.betaln(a, b) + np.log(special.betainc(a, b, 1.0 / (1.0 + alpha)))
    return float(
        np.log(2.0 * np.arctan(1.0 / np.sqrt(alpha)) / np.sqrt(np.pi))
        + n_on * np.log(alpha)
        - total * np.log1p(alpha)
        + special.gammaln(total + 0.5)
        - special.gammaln(total + 1.0)
        - share
    )


def ln_fair_split(first: int, second: int) -> float:
    """Return the ln probability of a split of counts between two equal exposures of the same rate.

    P = N!/(n1! n2!) 2^-N

    Args:
        first: n1 [events].
        second: n2 [events].

    Returns:
        ln probability given N [nats].

    Source:
        Binomial law, elementary.
    """
    scaled = _ln_scaled_beta(first + 1.0, second + 1.0)
    return float(2.0 * np.log(2.0) - np.log(first + second + 1.0) - scaled)


def _ln_scaled_beta(x: float, y: float) -> float:
    """Return ln[ B(x, y) 2^(x + y) ], keeping its digits where x and y are both large (Stirling, Loader)."""
    pair, total = np.array([x, y]), x + y
    corrections = stirling_error(pair).sum() - float(stirling_error(np.asarray(total)))
    middle = half_deviance(pair, np.full(2, 0.5 * total)).sum()
    powers = 0.5 * np.log(2.0 * np.pi * total / (x * y))
    return float(corrections + middle + powers)


def ln_unknown_split(first: int, second: int, shape: float = 1.0) -> float:
    """Return the ln evidence of a split of counts whose fraction has a symmetric beta prior.

    P = N!/(n1! n2!) B(n1 + a, n2 + a)/B(a, a)

    Args:
        first: n1 [events].
        second: n2 [events].
        shape: a of the prior Beta(a, a) of the fraction; > 0, 1 is uniform.

    Returns:
        ln evidence given N [nats].

    Source:
        D.J.C. MacKay, Information Theory, Inference, and Learning Algorithms (2003), exercise 3.15, from
        memory.
    """
    gained = _ln_scaled_beta(first + shape, second + shape) - _ln_scaled_beta(shape, shape)
    return ln_fair_split(first, second) + gained


def ln_intrinsic(observed: int, background: float) -> float:
    """Return ln B01 of a count on a known background, with the intrinsic prior of the signal.

    With the prior b/(s + b)^2 on s >= 0:
        B01 = Poisson(n | b) / [ b Gamma(n - 1, b)/n! ],   Gamma(n - 1, b) the upper incomplete gamma function

    Args:
        observed: n [events].
        background: b [events]; > 0.

    Returns:
        ln B01 [nats].

    Source:
        J.O. Berger, A comparison of testing methodologies, CERN-2008-001 (2008) 8, from memory.
    """
    b = background
    if observed >= 2:
        upper = ln_upper_gamma(np.asarray(observed - 2.0), np.asarray(b))
        ln_gamma = special.gammaln(observed - 1.0) + float(upper)
    elif observed == 1:
        ln_gamma = np.log(special.exp1(b))
    else:
        ln_gamma = np.log(special.expn(2, b) / b)
    return float((observed - 1.0) * np.log(b) - b - ln_gamma)


def ln_largest_support(observed: int, background: float) -> float:
    """Return the ln B01 that the signal most favoured by a count would give: no prior can go below.

    B01 >= Poisson(n | b)/Poisson(n | max(n, b))

    Args:
        observed: n [events].
        background: b [events]; > 0.

    Returns:
        ln of the bound [nats]; <= 0.

    Source:
        J.O. Berger, A comparison of testing methodologies, CERN-2008-001 (2008) 8, from memory.
    """
    if observed <= background:
        return 0.0
    return float(observed * np.log(background / observed) + observed - background)


def ln_unknown_shape(counts: npt.ArrayLike) -> Array:
    """Return ln B10 of a wholly unknown shape over equal bins against a flat one.

    With N counts in m bins and every division of the rate equally probable:
        B10 = m^N (m - 1)! product n_j!/(N + m - 1)!

    Args:
        counts: (..., bin) n_j [events].

    Returns:
        (...,) ln B10 [nats].

    Source:
        P.C. Gregory and T.J. Loredo, Astrophys. J. 398 (1992) 146, stepwise models, from memory.
    """
    n = np.asarray(counts, dtype=float)
    bins, total = n.shape[-1], n.sum(axis=-1)
    return np.asarray(
        total * np.log(bins)
        + special.gammaln(bins)
        + special.gammaln(n + 1.0).sum(axis=-1)
        - special.gammaln(total + bins)
    )


def null_posterior_normal_prior(deviation: npt.ArrayLike, observations: npt.ArrayLike) -> Array:
    """Return the posterior probability of a point null against a normal alternative, prior odds 1.

    With t the deviation of the mean of n observations in its own errors, and a prior as wide as one
    observation:
        B01 = sqrt(1 + n) exp( -(t^2/2) n/(n + 1) ),   P0 = B01/(1 + B01)

    Args:
        deviation: (...) t [standard errors of the mean].
        observations: (...) n; > 0.

    Returns:
        (...) posterior probability of the null.

    Source:
        J.O. Berger and T. Sellke, J. Am. Stat. Assoc. 82 (1987) 112, eq. for table 1, from memory.
    """
    t, n = np.asarray(deviation, dtype=float), np.asarray(observations, dtype=float)
    return np.asarray(special.expit(0.5 * np.log1p(n) - 0.5 * t * t * n / (n + 1.0)))
