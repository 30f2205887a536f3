"""How heavy is the tail of importance weights."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]


def k_hat(ln_weights: Array) -> float:
    """Return the Pareto shape of the largest importance weights.

    A generalised Pareto distribution is fitted to the min(N/5, 3 sqrt N) largest weights. Weights of shape k
    have moments up to order 1/k only.

    Args:
        ln_weights: (draw,) ln importance weights; at least 25.

    Returns:
        The shape; negative where the weights are bounded; -inf where the largest are all equal.

    Source:
        A. Vehtari, D. Simpson, A. Gelman, Y. Yao, J. Gabry, Pareto smoothed importance sampling,
        arXiv:1507.02646; fit by J. Zhang, M. Stephens, Technometrics 51 (2009) 316; from memory.
    """
    weights = np.sort(np.exp(ln_weights - ln_weights.max()))
    tail = int(min(0.2 * weights.size, 3.0 * np.sqrt(weights.size)))
    excess = weights[-tail:] - weights[-tail - 1]
    if excess[-1] <= 1e-12:
        return float("-inf")
    return _fit_shape(excess[excess > 0.0])


def _fit_shape(excess: Array) -> float:
    """Return the shape of a generalised Pareto distribution from ascending positive excesses."""
    n = excess.size
    if n < 5:
        return float("inf")
    guesses = 30 + int(np.sqrt(n))
    quartile = excess[int(n / 4.0 + 0.5) - 1]
    theta = 1.0 / excess[-1] + (1.0 - np.sqrt(guesses / (np.arange(1, guesses + 1) - 0.5))) / (3.0 * quartile)
    shape = np.log1p(-theta[:, None] * excess[None, :]).mean(axis=1)
    profile = n * (np.log(-theta / shape) - shape - 1.0)
    weight = 1.0 / np.exp(profile[None, :] - profile[:, None]).sum(axis=1)
    best = float((theta * weight).sum() / weight.sum())
    shape_hat = float(np.log1p(-best * excess).mean())
    return (n * shape_hat + 10.0 * 0.5) / (n + 10.0)


def largest_allowed(draws: int) -> float:
    """Return the largest k-hat at which an importance-sampling estimate and its error can be trusted.

    Args:
        draws: number of weights N.

    Returns:
        min(1 - 1/log10 N, 0.7).

    Source:
        A. Vehtari et al., arXiv:1507.02646; from memory.
    """
    return float(min(1.0 - 1.0 / np.log10(draws), 0.7))
