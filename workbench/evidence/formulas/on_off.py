"""Significances of one count against a background that was measured elsewhere.

Six answers to one question. They differ in what is done with the error of the background: ignored,
constrained in a likelihood, conditioned away, or averaged over. All are one-sided; an excess is positive.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.likelihood.laws import half_deviance

Array = npt.NDArray[np.float64]


def significance(tail: npt.ArrayLike) -> Array:
    """Return the standard deviations of a one-sided tail probability.

    Z = -Phi^-1(p)

    Args:
        tail: (...) p; 0 < p < 1.

    Returns:
        (...) Z [standard deviations]; negative for p > 1/2.

    Source:
        None, definition.
    """
    return -np.asarray(special.ndtri(np.asarray(tail, dtype=float)))


def known_tail(observed: npt.ArrayLike, background: npt.ArrayLike) -> Array:
    """Return the probability of at least this count from a known background.

    p = sum over k >= n of Poisson(k | b) = P(n, b), the regularised lower incomplete gamma function

    Args:
        observed: (...) n [events]; >= 0.
        background: (...) b [events]; >= 0.

    Returns:
        (...) p.

    Source:
        Elementary.
    """
    n, b = np.broadcast_arrays(np.asarray(observed, dtype=float), np.asarray(background, dtype=float))
    return np.where(n > 0.0, special.gammainc(np.maximum(n, 1e-300), b), 1.0)


def excess_over_root(observed: npt.ArrayLike, background: npt.ArrayLike) -> Array:
    """Return (n - b)/sqrt(b), which is a significance only for large counts and a known background.

    Args:
        observed: (...) n [events].
        background: (...) b [events]; > 0.

    Returns:
        (...) excess in Poisson standard deviations of the background.

    Source:
        None, definition; too large for few counts, as the comparison in Cousins, Linnemann and Tucker (2008)
        shows.
    """
    b = np.asarray(background, dtype=float)
    return np.asarray((np.asarray(observed, dtype=float) - b) / np.sqrt(b))


def likelihood_ratio(n_on: npt.ArrayLike, n_off: npt.ArrayLike, tau: npt.ArrayLike) -> Array:
    """Return the significance of on/off counts from their likelihood ratio.

    With N = n_on + n_off:
        Z^2 = 2 { n_on ln[ (1 + tau) n_on/N ] + n_off ln[ (1 + tau) n_off/(tau N) ] }

    Args:
        n_on: (...) counts where the signal would be [events].
        n_off: (...) counts in the control region [events].
        tau: (...) ratio of off to on exposure; > 0.

    Returns:
        (...) Z [standard deviations]; a deficit is negative, nothing at all is zero.

    Source:
        T.P. Li and Y.Q. Ma, Astrophys. J. 272 (1983) 317, eq. 17, from memory.
    """
    on, off = np.asarray(n_on, dtype=float), np.asarray(n_off, dtype=float)
    ratio = np.asarray(tau, dtype=float)
    background = (on + off) / (1.0 + ratio)
    squared = 2.0 * (half_deviance(on, background) + half_deviance(off, ratio * background))
    return np.asarray(np.sign(on - background) * np.sqrt(squared))


def binomial_tail(n_on: npt.ArrayLike, n_off: npt.ArrayLike, tau: npt.ArrayLike) -> Array:
    """Return the probability of at least n_on of all counts in the on region, when there is no signal.

    p = sum over k >= n_on of Binomial(k | N, 1/(1 + tau)) = I(n_on, n_off + 1; 1/(1 + tau))

    with N = n_on + n_off and I the regularised incomplete beta function, which also takes fractional n_off.
    It equals the Poisson tail averaged over the gamma posterior that n_off leaves for a flat background.

    Args:
        n_on: (...) counts where the signal would be [events]; >= 0.
        n_off: (...) counts in the control region [events]; >= 0.
        tau: (...) ratio of off to on exposure; > 0.

    Returns:
        (...) p.

    Source:
        R.D. Cousins, J.T. Linnemann, J. Tucker, Nucl. Instrum. Meth. A 595 (2008) 480, Z_Bi, from memory.
    """
    return gamma_averaged_tail(n_on, np.asarray(n_off, dtype=float) + 1.0, tau)


def gamma_averaged_tail(observed: npt.ArrayLike, shape: npt.ArrayLike, rate: npt.ArrayLike) -> Array:
    """Return the probability of at least this count from a background with a gamma distribution.

    p = I(n, a; 1/(1 + r)) for b ~ gamma(shape a, rate r)

    Args:
        observed: (...) n [events]; >= 0.
        shape: (...) a; > 0.
        rate: (...) r [1/events]; > 0.

    Returns:
        (...) p.

    Source:
        Tail of the negative binomial, elementary.
    """
    n, a, r = np.broadcast_arrays(*(np.asarray(x, dtype=float) for x in (observed, shape, rate)))
    return np.where(n > 0.0, special.betainc(np.maximum(n, 1e-300), a, 1.0 / (1.0 + r)), 1.0)


def profiled(observed: npt.ArrayLike, background: npt.ArrayLike, sd: npt.ArrayLike) -> Array:
    """Return the significance of a count from the profile likelihood with a Gaussian background.

    With m ~ normal(b, sd) and b0 = [ m - sd^2 + sqrt((m - sd^2)^2 + 4 n sd^2) ]/2 the background that fits
    without signal:
        Z^2 = 2 { n ln(n/b0) + b0 - n } + (m - b0)^2/sd^2

    Args:
        observed: (...) n [events]; >= 0.
        background: (...) m [events].
        sd: (...) one standard deviation of m [events]; > 0.

    Returns:
        (...) Z [standard deviations]; a deficit is negative.

    Source:
        R.D. Cousins, J.T. Linnemann, J. Tucker, Nucl. Instrum. Meth. A 595 (2008) 480, profile likelihood,
        from memory.
    """
    n, m = np.asarray(observed, dtype=float), np.asarray(background, dtype=float)
    v = np.asarray(sd, dtype=float) ** 2
    best = _background_without_signal(n, m, v)
    squared = 2.0 * half_deviance(n, best) + (m - best) ** 2 / v
    return np.asarray(np.sign(n - m) * np.sqrt(squared))


def _background_without_signal(n: Array, m: Array, v: Array) -> Array:
    """Return the larger root of b^2 + (v - m) b - n v = 0, in the form that does not cancel."""
    half = 0.5 * (m - v)
    root = np.sqrt(half * half + n * v)
    below = np.where(half > 0.0, 1.0, root - half)
    return np.where(half > 0.0, half + root, n * v / np.where(below > 0.0, below, 1.0))


def gaussian_averaged_tail(observed: int, background: float, sd: float) -> float:
    """Return the probability of at least this count from a background with a Gaussian distribution.

    p = integral over b >= 0 of normal(b; mean m, sd) P(n, b), with P the regularised lower incomplete gamma
    function. The part of the Gaussian below 0 is cut off and not made up for.

    Args:
        observed: n [events]; >= 0.
        background: m [events].
        sd: one standard deviation [events]; > 0.

    Returns:
        p.

    Limits:
        Where a good part of the Gaussian lies below 0 the cut decides; use a gamma distribution there.

    Source:
        R.D. Cousins, J.T. Linnemann, J. Tucker, Nucl. Instrum. Meth. A 595 (2008) 480, Z_N, from memory.
    """
    n, m, v = np.asarray(float(observed)), np.asarray(background), np.asarray(sd**2)
    peak = float(_background_without_signal(n, m, v))
    low = max(0.0, min(peak, background) - 12.0 * sd)
    high = max(peak, background) + 12.0 * sd
    # The tail rises from 0 to 1 over about sqrt(n) events: both that and the Gaussian need nodes.
    step = 0.5 * min(sd, np.sqrt(observed + 1.0))
    panels = int(np.clip(np.ceil((high - low) / step), 16, 200_000))
    nodes, weights = np.polynomial.legendre.leggauss(8)
    edges = np.linspace(low, high, panels + 1)
    half = 0.5 * np.diff(edges)[:, None]
    at = edges[:-1, None] + half * (1.0 + nodes)
    density = np.exp(-0.5 * ((at - background) / sd) ** 2) / (sd * np.sqrt(2.0 * np.pi))
    return float(np.sum(half * weights * density * known_tail(observed, at)))
