"""What an evidence calculation answers: estimates, evidences, comparisons, and all of them together."""

from __future__ import annotations

import math
from dataclasses import dataclass

from workbench.errors import Caution


@dataclass(frozen=True, slots=True)
class Estimate:
    """One estimator's ln evidence.

    Attributes:
        name: "closed form", "quadrature", "Laplace", "sampling", "average", "annealing" or "nested sampling".
        ln_evidence: ln marginal likelihood of the observed counts, the n! included [nats].
        error: one standard error of its numerical noise [nats]; 0 when exact.
        k_hat: Pareto shape of the largest importance weights; None where nothing was sampled.
        draws: number of points the integrand was evaluated at.
    """

    name: str
    ln_evidence: float
    error: float
    k_hat: float | None = None
    draws: int = 0


@dataclass(frozen=True, slots=True)
class Evidence:
    """The evidence of one hypothesis.

    Attributes:
        hypothesis: its name.
        ln_evidence: the reported ln evidence [nats]; None when no estimate exists at all.
        error: one standard error [nats].
        established: True when error, k-hat and the estimators' agreement are all in order.
        reason: why it is not established; empty when it is.
        estimates: every estimator's answer.
        alternatives: what it is an average of, where its backgrounds have alternatives.
        engine: which one made the reported number, "standard", "annealed" or "nested".
        engine_reason: why the standard one did not; empty where it did, or where another was asked for.
    """

    hypothesis: str
    ln_evidence: float | None
    error: float | None
    established: bool
    reason: str
    estimates: tuple[Estimate, ...]
    alternatives: tuple[AlternativeEvidence, ...] = ()
    engine: str = "standard"
    engine_reason: str = ""


@dataclass(frozen=True, slots=True)
class AlternativeEvidence:
    """The evidence of one alternative, or combination of alternatives, under a hypothesis.

    Attributes:
        name: the alternative's name.
        prior: its prior probability given the hypothesis; those of all alternatives add up to 1.
        evidence: its own evidence.
        posterior, posterior_error: its probability given the hypothesis and the counts; None where the
            evidences are not established.
    """

    name: str
    prior: float
    evidence: Evidence
    posterior: float | None = None
    posterior_error: float | None = None


@dataclass(frozen=True, slots=True)
class AlternativeFactor:
    """The Bayes factor if one alternative were known to hold.

    Attributes:
        name: the alternative's name.
        prior: its prior probability.
        ln_bayes_factor, ln_bayes_factor_error: ln B under it and its numerical error [nats].
        established: True when both evidences are.
    """

    name: str
    prior: float
    ln_bayes_factor: float | None
    ln_bayes_factor_error: float | None
    established: bool


@dataclass(frozen=True, slots=True)
class Posterior:
    """Prior and posterior probability of one hypothesis; posterior and error None when not established."""

    hypothesis: str
    prior: float
    probability: float | None
    error: float | None


@dataclass(frozen=True, slots=True)
class ScaledPrior:
    """How ln B answers a strength prior of another width.

    Attributes:
        parameter: the strength-like signal parameter.
        prior: the prior as declared, as text.
        halved: ln B with half the width [nats]; None where the family has no width to scale.
        doubled: ln B with twice the width [nats].
    """

    parameter: str
    prior: str
    halved: float | None
    doubled: float | None


@dataclass(frozen=True, slots=True)
class Comparison:
    """One hypothesis against the first.

    Attributes:
        hypothesis, against: their names.
        ln_bayes_factor, ln_bayes_factor_error: ln B and its numerical error [nats]; the value is None when an
            evidence is missing.
        prior_odds: ratio of the prior probabilities.
        posterior_odds, posterior_odds_error: None when not established.
        established: True when both evidences are.
        sensitivity: how ln B changes with the width of each strength prior.
        alternatives: ln B under each alternative of the backgrounds alone; none where there is no doubt.
    """

    hypothesis: str
    against: str
    ln_bayes_factor: float | None
    ln_bayes_factor_error: float | None
    prior_odds: float
    posterior_odds: float | None
    posterior_odds_error: float | None
    established: bool
    sensitivity: tuple[ScaledPrior, ...] = ()
    alternatives: tuple[AlternativeFactor, ...] = ()


@dataclass(frozen=True, slots=True)
class Weighing:
    """Evidences, comparisons and posterior probabilities of all hypotheses, in file order.

    Attributes:
        evidences: one a hypothesis.
        posteriors: one a hypothesis.
        comparisons: every hypothesis but the first, against the first.
        seed: the seed that every random number came from.
        cautions: what a reader should know.
    """

    evidences: tuple[Evidence, ...]
    posteriors: tuple[Posterior, ...]
    comparisons: tuple[Comparison, ...]
    seed: int
    cautions: tuple[Caution, ...] = ()

    @property
    def established(self) -> bool:
        """Return True when every evidence is established."""
        return all(evidence.established for evidence in self.evidences)

    def evidence_of(self, hypothesis: str) -> Evidence:
        """Return the evidence of the hypothesis of that name."""
        return next(one for one in self.evidences if one.hypothesis == hypothesis)


def largest_gap(*errors: float | None) -> float:
    """Return how far two answers to one question may lie apart: 0.05 and three of their combined errors.

    Args:
        errors: one standard error of each [nats]; None for an exact one.
    """
    return 0.05 + 3.0 * math.hypot(*(error or 0.0 for error in errors))
