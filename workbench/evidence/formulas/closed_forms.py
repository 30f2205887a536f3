"""Evidences that integrate in closed form: the exact answers that numerical ones are held against.

A Poisson count whose mean has a gamma prior or a uniform one follows a law that can be written down. Two
sources of events add: their laws are convolved, a finite sum. A control region turns a gamma prior of the
background into another gamma prior. So known backgrounds, gamma backgrounds and on/off counts are one sum.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.evidence.formulas.count_mixtures import (
    ln_gamma_mixture,
    ln_sum_of_two,
    ln_uniform_mixture,
    ln_upper_gamma,
)
from workbench.likelihood.laws import ln_poisson

Array = npt.NDArray[np.float64]


def ln_known_background(observed: int, background: float, shape: float, rate: float) -> float:
    """Return ln p(n) for a known background and a signal with a gamma prior.

    With n ~ Poisson(s + b), s ~ gamma(shape a, rate r):
        p(n) = sum over k of Poisson(n - k | b) Gamma(k + a)/(k! Gamma(a)) (r/(1 + r))^a (1 + r)^-k

    The same number serves a known signal on a background with a gamma prior.

    Args:
        observed: n [events].
        background: b, the known mean [events]; >= 0.
        shape: a of the other source's prior.
        rate: r of the other source's prior [1/events].

    Returns:
        ln evidence [nats].

    Source:
        Elementary; for the known signal: H.B. Prosper, Practical statistics for particle physicists
        (lectures, 2015), from memory.
    """
    return ln_sum_of_two(
        observed,
        lambda counts: ln_gamma_mixture(counts, shape, rate),
        lambda counts: ln_poisson(counts, np.asarray(background)),
    )


def ln_known_background_exponential(observed: int, background: float, mean: float) -> float:
    """Return ln p(n) for a known background and a signal with an exponential prior.

    With r = 1/mean and Q the regularised upper incomplete gamma function:
        p(n) = r exp(b r) (1 + r)^-(n + 1) Q(n + 1, b (1 + r))

    Args:
        observed: n [events].
        background: b [events]; >= 0.
        mean: mean of the signal's prior [events]; > 0.

    Returns:
        ln evidence [nats].

    Source:
        Elementary gamma integral.
    """
    rate = 1.0 / mean
    counts = np.asarray(float(observed))
    upper = float(ln_upper_gamma(counts, np.asarray(background * (1.0 + rate))))
    return float(np.log(rate) + background * rate - (observed + 1.0) * np.log1p(rate) + upper)


def ln_known_background_uniform(observed: int, background: float, low: float, high: float) -> float:
    """Return ln p(n) for a known background and a signal with a uniform prior.

    The sum of both is uniform between b + low and b + high.

    Args:
        observed: n [events].
        background: b [events]; >= 0.
        low: lower limit of the signal [events]; >= 0.
        high: upper limit of the signal [events]; > low.

    Returns:
        ln evidence [nats].

    Source:
        Elementary gamma integral.
    """
    return float(ln_uniform_mixture(observed, background + low, background + high))


def ln_gamma_background(observed: int, background: tuple[float, float], signal: tuple[float, float]) -> float:
    """Return ln p(n) where background and signal both have gamma priors.

    p(n) = sum over k of P(k | signal) P(n - k | background), both negative binomial

    Args:
        observed: n [events].
        background: shape and rate of the background's prior.
        signal: shape and rate of the signal's prior.

    Returns:
        ln evidence [nats].

    Source:
        Convolution of two gamma-Poisson mixtures, elementary.
    """
    return ln_sum_of_two(
        observed,
        lambda counts: ln_gamma_mixture(counts, *signal),
        lambda counts: ln_gamma_mixture(counts, *background),
    )


def measured(prior: tuple[float, float], count: int, exposure: float) -> tuple[float, float]:
    """Return the gamma posterior of a background after counting it elsewhere.

    gamma(a, r) becomes gamma(a + n, r + tau).

    Args:
        prior: shape a and rate r.
        count: n, what the control region counted [events].
        exposure: tau, background events expected there for one expected in the signal region.

    Returns:
        Shape and rate.

    Source:
        Conjugate prior of the Poisson law, elementary.
    """
    return prior[0] + count, prior[1] + exposure


def ln_on_off_background(n_on: int, n_off: int, tau: float, prior: tuple[float, float]) -> float:
    """Return ln p(n_on, n_off) of on/off counts without a signal.

    With n_on ~ Poisson(b), n_off ~ Poisson(tau b), b ~ gamma(a, r) and N = n_on + n_off + a:
        ln p = n_off ln tau - ln n_on! - ln n_off! + a ln r - ln Gamma(a) + ln Gamma(N) - N ln(1 + tau + r)

    evaluated as p(n_off) p(n_on | n_off), which keeps its digits for large counts.

    Args:
        n_on: counts where the signal would be [events].
        n_off: counts in the control region [events].
        tau: ratio of the background expected there to that in the signal region; > 0.
        prior: shape a and rate r of the background in the signal region.

    Returns:
        ln evidence [nats].

    Source:
        Elementary gamma integral; setting of T.P. Li and Y.Q. Ma, Astrophys. J. 272 (1983) 317, from memory.
    """
    control = float(ln_gamma_mixture(n_off, prior[0], prior[1] / tau))
    return control + float(ln_gamma_mixture(n_on, *measured(prior, n_off, tau)))


def ln_on_off_signal(
    n_on: int, n_off: int, tau: float, prior: tuple[float, float], signal: tuple[float, float]
) -> float:
    """Return ln p(n_on, n_off) of on/off counts with a signal that has a gamma prior.

    With n_on ~ Poisson(s + b) and s ~ gamma(c, t):
        p = sum over k of Gamma(k + c)/(k! Gamma(c)) (t/(1 + t))^c (1 + t)^-k p0(n_on - k, n_off)

    with p0 the evidence without a signal. No on-counts give B10 = (t/(1 + t))^c whatever the background.

    Args:
        n_on: counts where the signal would be [events].
        n_off: counts in the control region [events].
        tau: ratio of the background expected there to that in the signal region; > 0.
        prior: shape and rate of the background in the signal region.
        signal: shape c and rate t of the signal.

    Returns:
        ln evidence [nats].

    Source:
        Elementary; compare S. Gillessen and H.L. Harney, Astron. Astrophys. 430 (2005) 355, from memory.
    """
    control = float(ln_gamma_mixture(n_off, prior[0], prior[1] / tau))
    return control + ln_gamma_background(n_on, measured(prior, n_off, tau), signal)


def ln_half_line(gradient: npt.ArrayLike, curvature: npt.ArrayLike) -> Array:
    """Return the ln of a Gaussian integral over half a line, for a maximum at or beyond a boundary.

    ln of the integral over x >= 0 of exp(g x - h x^2/2) = ln(pi/(2 h))/2 + ln erfcx( -g/sqrt(2 h) )

    Args:
        gradient: (...) g, slope of the ln integrand at the boundary.
        curvature: (...) h, minus its second derivative; > 0.

    Returns:
        (...) ln of the integral.

    Limits:
        Exact for a parabola. With few counts and g near 0 the real curve differs (-0.16 for 10 counts on
        10): use quadrature there.

    Source:
        Elementary; erfcx is the scaled complementary error function.
    """
    height = np.asarray(curvature, dtype=float)
    at = -np.asarray(gradient, dtype=float) / np.sqrt(2.0 * height)
    inside = np.minimum(at, 0.0)
    ln_erfcx = np.where(
        at < 0.0,
        inside**2 + np.log(2.0) + special.log_ndtr(-np.sqrt(2.0) * inside),
        np.log(special.erfcx(np.maximum(at, 0.0))),
    )
    return np.asarray(0.5 * np.log(np.pi / (2.0 * height)) + ln_erfcx)
