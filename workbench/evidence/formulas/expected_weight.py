"""What the evidence can be expected to say, and how far it can go: before any counts are looked at."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
from scipy import special

Array = npt.NDArray[np.float64]


def expected_weight_for_signal(signal: npt.ArrayLike, background: npt.ArrayLike) -> float:
    """Return the mean ln B10 of two hypotheses without free parameters when the signal is there.

    E1[ln B10] = sum over bins of (s + b) ln(1 + s/b) - s

    Args:
        signal: (bin,) s [events]; >= 0.
        background: (bin,) b [events]; > 0.

    Returns:
        Expected weight of evidence [nats]: half the squared expected significance.

    Source:
        Elementary; compare G. Cowan et al., Eur. Phys. J. C 71 (2011) 1554, eq. 97, from memory.
    """
    s, b = np.asarray(signal, dtype=float), np.asarray(background, dtype=float)
    return float(np.sum((s + b) * np.log1p(s / b) - s))


def expected_weight_for_background(signal: npt.ArrayLike, background: npt.ArrayLike) -> float:
    """Return the mean ln B01 of two hypotheses without free parameters when no signal is there.

    E0[ln B01] = sum over bins of s - b ln(1 + s/b)

    Args:
        signal: (bin,) s [events]; >= 0.
        background: (bin,) b [events]; > 0.

    Returns:
        Expected weight of evidence [nats].

    Source:
        Elementary.
    """
    s, b = np.asarray(signal, dtype=float), np.asarray(background, dtype=float)
    return float(np.sum(s - b * np.log1p(s / b)))


def expected_significance(signal: float, background: float, background_sd: float) -> float:
    """Return the significance expected from a count whose background was measured elsewhere.

    With v = sd^2:
        Z^2 = 2 { (s + b) ln[ (s + b)(b + v)/(b^2 + (s + b) v) ] - (b^2/v) ln[ 1 + v s/(b (b + v)) ] }

    Args:
        signal: s [events]; >= 0.
        background: b [events]; > 0.
        background_sd: one standard deviation of b [events]; 0 for a known background.

    Returns:
        Z [standard deviations].

    Source:
        The on/off likelihood ratio of T.P. Li and Y.Q. Ma (1983) on expected data with tau = b/v; G. Cowan,
        Discovery sensitivity for a counting experiment with background uncertainty (note, 2012), from memory.
    """
    s, b, v = signal, background, background_sd**2
    if v == 0.0:
        return float(np.sqrt(2.0 * expected_weight_for_signal(s, b)))
    total = s + b
    counted = total * np.log1p(s * b / (b * b + total * v))
    control = (b * b / v) * np.log1p(v * s / (b * (b + v)))
    return float(np.sqrt(2.0 * max(counted - control, 0.0)))


def half_normal_weight(significance: npt.ArrayLike, width: npt.ArrayLike) -> Array:
    """Return ln B10 of a Gaussian measurement with a half-normal prior on a signal that cannot be negative.

    With Z the measurement and R the prior's width, both in units of its error:
        B10 = 2 phi(Z; 0, 1 + R^2)/phi(Z; 0, 1) Phi( Z R/sqrt(1 + R^2) )

    At fixed Z it falls as 1/R however significant the measurement is (the Lindley gap).

    Args:
        significance: (...) Z [standard deviations].
        width: (...) R; > 0.

    Returns:
        (...) ln B10 [nats].

    Source:
        D.V. Lindley, Biometrika 44 (1957) 187, for the effect, from memory; the integral is elementary.
    """
    z, r = np.asarray(significance, dtype=float), np.asarray(width, dtype=float)
    spread = 1.0 + r * r
    return np.asarray(
        np.log(2.0)
        - 0.5 * np.log(spread)
        + 0.5 * z * z * (r * r / spread)
        + special.log_ndtr(z * r / np.sqrt(spread))
    )


def ceiling_on_expectation(width: npt.ArrayLike) -> Array:
    """Return the ln B01 of a measurement exactly on the background: sqrt(1 + R^2) for a half-normal prior.

    Args:
        width: (...) R, width of the signal's prior in units of the measurement's error; > 0.

    Returns:
        (...) ln B01 [nats]; more is reached only by a downward fluctuation.

    Source:
        `half_normal_weight` at Z = 0.
    """
    return np.asarray(0.5 * np.log1p(np.asarray(width, dtype=float) ** 2))


def ceiling_without_counts(mean: npt.ArrayLike) -> Array:
    """Return the largest ln B01 that counting nothing can give: ln(1 + S) for an exponential prior of mean S.

    Args:
        mean: (...) S [events]; >= 0.

    Returns:
        (...) ln B01 [nats], whatever the background.

    Source:
        The evidence of a known background and an exponential prior at n = 0, elementary.
    """
    return np.asarray(np.log1p(np.asarray(mean, dtype=float)))


def weight_at_endless_exposure(signal_to_background: float, background_error: float) -> float:
    """Return the expected ln B10 at which a background uncertainty stops further growth: q^2/(2 f^2).

    Args:
        signal_to_background: q.
        background_error: f, relative uncertainty of the background; > 0.

    Returns:
        Expected weight of evidence [nats] of one bin as exposure grows without end.

    Limits:
        Gaussian: f and q well below 1.

    Source:
        Elementary: both statistical terms vanish beside f b.
    """
    return 0.5 * (signal_to_background / background_error) ** 2
