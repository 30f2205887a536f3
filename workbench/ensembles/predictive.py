"""What a hypothesis expects before any count is seen."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
import numpy.typing as npt

from workbench.ensembles.drawing import pseudo_experiments
from workbench.hypotheses.alternatives import Variant, variants_of
from workbench.hypotheses.analysis import Analysis
from workbench.likelihood.model import compile_model

Array = npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class PriorPredictive:
    """Counts that a hypothesis expects under its priors, all regions' bins in order.

    Attributes:
        hypothesis: its name.
        low, median, high: (bin,) central 68 % of the counts in each bin [events].
        total_low, total_median, total_high: the same of the total [events].
    """

    hypothesis: str
    low: Array
    median: Array
    high: Array
    total_low: float
    total_median: float
    total_high: float


@np.errstate(all="ignore")  # expectations beyond what can be drawn are drawn at the largest mean
def prior_predictive(
    analysis: Analysis, hypothesis: str, *, seed: int = 1, draws: int = 400
) -> PriorPredictive:
    """Return the central 68 % of counts drawn from a hypothesis with all parameters drawn from their priors.

    Where backgrounds have alternatives, each is drawn as often as its prior probability says.

    Args:
        analysis: everything declared; observed counts are not used.
        hypothesis: the hypothesis' name.
        seed: where the draws come from.
        draws: pseudo-experiments.

    Returns:
        Bands of the counts in each bin and of the total.

    Raises:
        InputError: if there is no such hypothesis.
    """
    variants = variants_of(analysis, hypothesis)
    index = [one.name for one in analysis.hypotheses].index(hypothesis)
    source = np.random.SeedSequence(seed, spawn_key=(2, index))
    counts = np.concatenate(
        [
            block
            for variant, (first, last) in zip(variants, _shares(variants, draws), strict=True)
            for block in pseudo_experiments(
                compile_model(variant.analysis, hypothesis), source, last - first, first=first
            )
        ]
    )
    low, median, high = np.quantile(counts, [0.16, 0.5, 0.84], axis=0)
    total_low, total_median, total_high = np.quantile(counts.sum(axis=1), [0.16, 0.5, 0.84])
    return PriorPredictive(
        hypothesis, low, median, high, float(total_low), float(total_median), float(total_high)
    )


def _shares(variants: Sequence[Variant], draws: int) -> list[tuple[int, int]]:
    """Return the first and last draw of each variant, in proportion to their prior probabilities."""
    ends = np.round(np.cumsum([one.prior for one in variants]) * draws).astype(int).tolist()
    return list(pairwise([0, *ends[:-1], draws]))
