"""The updating ratio where backgrounds have alternatives: averaged over them as far as counts support each.

    R(x) = sum_v P(v) p(n | x, v)/sum_v P(v) p(n | v) = sum_v w_v R_v(x)

w_v is the posterior probability of alternative v under background only, and R_v the ratio under it alone.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.evidence.ratio.surface import Surface
from workbench.evidence.results import Evidence
from workbench.evidence.weigh import Weighed
from workbench.hypotheses.analysis import Analysis

Array = npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class Part:
    """One alternative of the backgrounds, or the whole analysis where there are none.

    Attributes:
        prior: its probability; those of all parts add up to 1.
        analysis: with this alternative in force.
        first: background only, weighed.
        weighed: the hypothesis scanned, weighed.
    """

    prior: float
    analysis: Analysis
    first: Weighed
    weighed: Weighed


@dataclass(frozen=True, slots=True, eq=False)
class Ratio:
    """A Bayes factor or updating ratio: its ln and error [nats]."""

    ln_ratio: float
    error: float


def ratio_of(parts: Sequence[Part], evidences: Sequence[Evidence]) -> Ratio | None:
    """Return the ratio of an average evidence to that of background only.

    Args:
        parts: one an alternative.
        evidences: the numerator under each.

    Returns:
        ln of the ratio and its error; None where an evidence is missing.

    Source:
        First-order propagation of the errors of ln Z_v.
    """
    above = [one.ln_evidence for one in evidences if one.ln_evidence is not None]
    below = [part.first.evidence.ln_evidence for part in parts if part.first.evidence.ln_evidence is not None]
    if len(above) < len(parts) or len(below) < len(parts):
        return None
    ln_prior = np.log([part.prior for part in parts])
    sums = [ln_prior + np.array(values) for values in (above, below)]
    shares = [special.softmax(one) for one in sums]
    errors = [
        np.array([one.error or 0.0 for one in evidences]),
        np.array([part.first.evidence.error or 0.0 for part in parts]),
    ]
    ln_ratio = float(special.logsumexp(sums[0]) - special.logsumexp(sums[1]))
    variance = sum(float(((share * error) ** 2).sum()) for share, error in zip(shares, errors, strict=True))
    return Ratio(ln_ratio, float(np.sqrt(variance)))


def combined(parts: Sequence[Part], surfaces: Sequence[Surface]) -> Surface:
    """Return the surface of the average, at the nodes of the alternative that the counts support most.

    Args:
        parts: one an alternative, each with both evidences.
        surfaces: R under each alone.
    """
    if len(parts) == 1:
        return surfaces[0]
    evidences = np.array([part.first.evidence.ln_evidence for part in parts], dtype=float)
    doubts = np.array([part.first.evidence.error or 0.0 for part in parts])
    ln_weights = np.log([part.prior for part in parts]) + evidences
    ln_weights = ln_weights - special.logsumexp(ln_weights)
    lead = surfaces[int(np.argmax(ln_weights))]
    points = lead.nodes.reshape(-1, len(lead.names))
    read = [_at(one, points, lead) for one in surfaces]
    ln_ratios = np.stack([ln_weight + one[0] for ln_weight, one in zip(ln_weights, read, strict=True)])
    errors = np.stack([one[1] for one in read])
    shares = special.softmax(ln_ratios, axis=0)
    moved = (shares - np.exp(ln_weights)[:, None]) * doubts[:, None]
    error = np.sqrt(((shares * errors) ** 2 + moved**2).sum(axis=0))
    ln_ratio = special.logsumexp(ln_ratios, axis=0)
    shape = lead.ln_ratio.shape
    return replace(lead, ln_ratio=ln_ratio.reshape(shape), error=error.reshape(shape))


def _at(surface: Surface, points: Array, lead: Surface) -> tuple[Array, Array]:
    if surface is lead:
        return surface.ln_ratio.ravel(), surface.error.ravel()
    return surface.at(points)
