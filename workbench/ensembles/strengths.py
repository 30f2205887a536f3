"""A strength's posterior median and central interval from the weighted draws of an evidence."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.evidence.central import CENTRAL, Central
from workbench.evidence.integral.sampling import SCRAMBLES, Sample
from workbench.evidence.weigh import Weighed

Array = npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class StrengthEstimate(Central):
    """What counts say of a strength if its hypothesis holds.

    Attributes:
        hypothesis, parameter: whose.
        alternative: the alternative of the backgrounds that it holds under; empty where there is no doubt.
    """

    hypothesis: str
    parameter: str
    alternative: str = ""


def strength_estimates(weighed: Weighed, alternative: str = "") -> tuple[StrengthEstimate, ...]:
    """Return the estimate of each strength of a hypothesis; none where nothing was drawn or established.

    Args:
        weighed: the hypothesis' evidence with its draws.
        alternative: what it was made under.

    Returns:
        One a strength, in the parameters' order.

    Source:
        none, definition: quantiles of the posterior; their errors from the spread of the draws' independent
        scrambles.
    """
    model, sample = weighed.model, weighed.sample
    if sample is None or not weighed.evidence.established:
        return ()
    return tuple(
        _estimate(
            model.hypothesis, one.name, one.prior.from_standard(sample.points[:, k])[0], sample, alternative
        )
        for k, one in enumerate(model.coordinates)
        if one.is_strength
    )


def _estimate(
    hypothesis: str, parameter: str, values: Array, sample: Sample, alternative: str
) -> StrengthEstimate:
    weights = special.softmax(sample.ln_weights)
    median, low, high = weighted_quantiles(values, weights, CENTRAL).tolist()
    parts = [
        weighted_quantiles(x, w, CENTRAL)
        for x, w in zip(values.reshape(SCRAMBLES, -1), weights.reshape(SCRAMBLES, -1), strict=True)
    ]
    of_median, of_low, of_high = (np.std(parts, axis=0, ddof=1) / np.sqrt(SCRAMBLES)).tolist()
    return StrengthEstimate(median, low, high, of_median, of_low, of_high, hypothesis, parameter, alternative)


def weighted_quantiles(values: Array, weights: Array, p: Array) -> Array:
    """Return (level,) quantiles of weighted values.

    Args:
        values: (draw,) values.
        weights: (draw,) weights >= 0, not all 0.
        p: (level,) probabilities.

    Returns:
        Values that the stated share of the weight lies below, each draw's own weight counted half.
    """
    order = np.argsort(values)
    cumulative = np.cumsum(weights[order]) - 0.5 * weights[order]
    return np.asarray(np.interp(p * weights.sum(), cumulative, values[order]))
