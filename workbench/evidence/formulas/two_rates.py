"""Are two counts with different exposures from one rate: the classical tests.

The first count is suspected of the larger rate. Exposures in any unit (person-years, kilogram-years), the
same for both.
"""

from __future__ import annotations

from typing import Literal

import numpy as np
from scipy import special

RatioTest = Literal["wald", "wald-log", "score-log", "sqrt"]


def ratio_tail(counts: tuple[int, int], exposures: tuple[float, float], test: RatioTest) -> float:
    """Return the one-sided p-value of a rate ratio above 1.

    With d = t2/t1:
        wald       (x1 - x2/d)/sqrt(x1 + x2/d^2)
        wald-log   (ln(x1/x2) + ln d)/sqrt(1/x1 + 1/x2)
        score-log  (ln(x1/x2) + ln d)/sqrt((2 + 1/d + d)/(x1 + x2))
        sqrt       2 (sqrt(x1 + 3/8) - sqrt((x2 + 3/8)/d))/sqrt(1 + 1/d)

    Args:
        counts: x1, x2 [events]; both > 0 for the logarithmic tests.
        exposures: t1, t2; > 0.
        test: which statistic.

    Returns:
        p.

    Source:
        K. Gu, H.K.T. Ng, M.L. Tang, W.R. Schucany, Biometrical J. 50 (2008) 283, from memory.
    """
    x1, x2 = counts
    d = exposures[1] / exposures[0]
    if test == "wald":
        z = (x1 - x2 / d) / np.sqrt(x1 + x2 / d**2)
    elif test == "sqrt":
        z = 2.0 * (np.sqrt(x1 + 0.375) - np.sqrt((x2 + 0.375) / d)) / np.sqrt(1.0 + 1.0 / d)
    else:
        spread = 1.0 / x1 + 1.0 / x2 if test == "wald-log" else (2.0 + 1.0 / d + d) / (x1 + x2)
        z = (np.log(x1 / x2) + np.log(d)) / np.sqrt(spread)
    return float(special.ndtr(-z))


def difference_tail(
    counts: tuple[int, int], exposures: tuple[float, float], test: Literal["wald", "score"]
) -> float:
    """Return the one-sided p-value of a rate difference above 0.

    z = (x1/t1 - x2/t2)/sd, with the variance from each count by itself (wald: x1/t1^2 + x2/t2^2) or from
    their common rate (score: (x1 + x2)/(t1 t2)).

    Args:
        counts: x1, x2 [events].
        exposures: t1, t2; > 0.
        test: which variance.

    Returns:
        p.

    Source:
        H.K.T. Ng, K. Gu, M.L. Tang, Comput. Stat. Data Anal. 51 (2007) 3085, from memory.
    """
    (x1, x2), (t1, t2) = counts, exposures
    variance = x1 / t1**2 + x2 / t2**2 if test == "wald" else (x1 + x2) / (t1 * t2)
    return float(special.ndtr(-(x1 / t1 - x2 / t2) / np.sqrt(variance)))


def estimated_tail(counts: tuple[int, int], exposures: tuple[float, float]) -> float:
    """Return the two-sided p-value of a rate difference from the exact law at the estimated common rate.

    The probability, with both counts Poisson at the rate (x1 + x2)/(t1 + t2), of a difference in units of
    its own error (wald) at least as large as the observed one.

    Args:
        counts: x1, x2 [events].
        exposures: t1, t2; > 0.

    Returns:
        p; 1 when both counts are 0.

    Limits:
        Sums over all pairs of counts within ten standard deviations: meant for up to a few thousand counts.

    Source:
        K. Krishnamoorthy and J. Thomson, J. Stat. Plan. Inference 119 (2004) 23, the E-test, from memory.
    """
    (x1, x2), (t1, t2) = counts, exposures
    if x1 + x2 == 0:
        return 1.0
    rate = (x1 + x2) / (t1 + t2)
    means = rate * t1, rate * t2
    first, second = (np.arange(np.ceil(mean + 10.0 * np.sqrt(mean) + 30.0)) for mean in means)
    laws = [
        np.exp(special.xlogy(k, mean) - mean - special.gammaln(k + 1.0))
        for k, mean in zip((first, second), means, strict=True)
    ]
    one, two = first[:, None], second[None, :]
    variance = one / t1**2 + two / t2**2
    size = np.abs(one / t1 - two / t2) / np.sqrt(np.where(variance > 0.0, variance, 1.0))
    seen = abs(x1 / t1 - x2 / t2) / np.sqrt(x1 / t1**2 + x2 / t2**2)
    return float(np.sum(laws[0][:, None] * laws[1][None, :] * (size >= seen * (1.0 - 1e-12))))
