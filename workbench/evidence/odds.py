"""Bayes factors, posterior odds and probabilities from evidences, with their numerical errors."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.evidence.results import Comparison, Evidence, Posterior

Array = npt.NDArray[np.float64]


def compare(evidence: Evidence, against: Evidence, prior_odds: float) -> Comparison:
    """Return one hypothesis against another.

    ln B = ln Z1 - ln Z0, error = quadrature sum; posterior odds = B x prior odds, error = odds x the one of
    ln B.

    Args:
        evidence: the hypothesis' evidence.
        against: that of the first hypothesis.
        prior_odds: ratio of the prior probabilities.

    Returns:
        The comparison; odds are None where it is not established or too large for a number.

    Source:
        R.E. Kass, A.E. Raftery, Bayes factors, J. Am. Stat. Assoc. 90 (1995) 773, equation 1; from memory.
    """
    established = evidence.established and against.established
    if evidence.ln_evidence is None or against.ln_evidence is None:
        return Comparison(
            evidence.hypothesis, against.hypothesis, None, None, prior_odds, None, None, established
        )
    ln_bayes_factor = evidence.ln_evidence - against.ln_evidence
    error = float(np.hypot(evidence.error or 0.0, against.error or 0.0))
    odds = None
    if established:
        ln_odds = ln_bayes_factor + float(np.log(prior_odds))
        odds = float(np.exp(ln_odds)) if ln_odds < 700.0 else None
    return Comparison(
        evidence.hypothesis,
        against.hypothesis,
        ln_bayes_factor,
        error,
        prior_odds,
        odds,
        None if odds is None else odds * error,
        established,
    )


def posteriors(evidences: tuple[Evidence, ...], priors: Array) -> tuple[Posterior, ...]:
    """Return posterior probabilities of all hypotheses with their numerical errors.

    P_i = p_i Z_i / sum_j p_j Z_j, error P_i sqrt( sum_j (delta_ij - P_j)^2 e_j^2 ).

    Args:
        evidences: one a hypothesis.
        priors: (hypothesis,) prior probabilities, adding up to 1.

    Returns:
        One a hypothesis; probability and error are None as soon as one evidence is not established.

    Source:
        Bayes' theorem; first-order propagation of the errors of ln Z.
    """
    names = [evidence.hypothesis for evidence in evidences]
    values = [evidence.ln_evidence for evidence in evidences if evidence.ln_evidence is not None]
    if not all(evidence.established for evidence in evidences) or len(values) < len(names):
        return tuple(
            Posterior(name, float(prior), None, None) for name, prior in zip(names, priors, strict=True)
        )
    probability = special.softmax(np.array(values) + np.log(priors))
    errors = np.array([evidence.error or 0.0 for evidence in evidences])
    spread = (np.eye(len(names)) - probability[None, :]) ** 2 @ errors**2
    error = probability * np.sqrt(spread)
    return tuple(
        Posterior(name, float(p), float(q), float(e))
        for name, p, q, e in zip(names, priors, probability, error, strict=True)
    )
