"""What one hypothesis' evidence becomes when something is changed: weighted anew, or made afresh."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from workbench.evidence.integral.pareto import k_hat, largest_allowed
from workbench.evidence.integral.sampling import SCRAMBLES
from workbench.evidence.ledger.chain import sampling_errors
from workbench.evidence.ledger.results import AFRESH, EXACT, REWEIGHTED
from workbench.evidence.results import Evidence

Array = npt.NDArray[np.float64]

_LARGEST_ERROR = 0.03
_HEAVIEST = 0.5  # k-hat from which the variance, and with it the error, is no longer there to be estimated


@dataclass(frozen=True, slots=True)
class Changed:
    """An evidence with something changed: bins left out, an uncertainty frozen or doubled.

    Attributes:
        ln_evidence: ln evidence after the change [nats]; None where it is not established.
        error: one standard error of it [nats].
        change: ln evidence before less after [nats]; None where it is not established.
        change_error: one standard error of it, smaller than both evidences' where the draws are the same.
        way: "reweighted", "fresh evidence" or "closed form".
        k_hat: Pareto shape of the weights; None where nothing was weighted anew.
    """

    ln_evidence: float | None
    error: float | None
    change: float | None
    change_error: float | None
    way: str
    k_hat: float | None = None


def unchanged(evidence: Evidence) -> Changed:
    """Return the evidence of a hypothesis that the change does not concern."""
    return Changed(evidence.ln_evidence, evidence.error, 0.0, 0.0, EXACT)


def afresh(evidence: Evidence, other: Evidence) -> Changed:
    """Return a change from an evidence made afresh, None in all numbers where it is not established."""
    way = EXACT if evidence.error == 0.0 and other.error == 0.0 else AFRESH
    value, error, before = other.ln_evidence, other.error or 0.0, evidence.ln_evidence
    if value is None or before is None or not other.established:
        return Changed(None, None, None, None, way)
    return Changed(value, error, before - value, float(np.hypot(error, evidence.error or 0.0)), way)


@np.errstate(all="ignore")  # a draw that can't fill a bin has ln probability -inf
def reweighted(evidence: Evidence, before: Array, after: Array) -> Changed | None:
    """Return a change from draws weighted anew.

    With w the draws' weights:
        ln Z(after) = ln Z + ln mean(w after) - ln mean(w before)
    its error from the jackknife over independent groups of draws.

    Args:
        evidence: the evidence before the change.
        before: (draw,) ln weights for it, scramble after scramble [nats].
        after: (draw,) ln weights after the change [nats].

    Returns:
        The change; None where the tail of the new weights is too heavy or their error too large.

    Source:
        Importance sampling, judged by k-hat: A. Vehtari, A. Gelman, J. Gabry, Stat. Comput. 27 (2017) 1413;
        from memory.
    """
    whole, parts = _ln_means(before)
    changed_whole, changed_parts = _ln_means(after)
    change, error = whole - changed_whole, float(sampling_errors(parts - changed_parts))
    shape = k_hat(after)
    if evidence.ln_evidence is None or not np.isfinite(change):
        return None
    if shape >= min(largest_allowed(after.size), _HEAVIEST) or not error <= _LARGEST_ERROR:
        return None
    known = float(np.hypot(error, evidence.error or 0.0))
    return Changed(evidence.ln_evidence - change, known, change, error, REWEIGHTED, shape)


def _ln_means(ln_weights: Array) -> tuple[float, Array]:
    """Return ln of the mean weight, and (scramble,) the same without each scramble."""
    top = float(ln_weights.max())
    sums = np.exp(ln_weights - top).reshape(SCRAMBLES, -1).sum(axis=1)
    rest = ln_weights.size * (SCRAMBLES - 1.0) / SCRAMBLES
    return top + float(np.log(sums.sum() / ln_weights.size)), top + np.log((sums.sum() - sums) / rest)
