"""Evidences of hypotheses that are an average over alternatives of their backgrounds.

Each combination of alternatives is an analysis of its own, weighed by the same engine as any other; what is
done here is the average, what it rests on, and what each alternative says alone.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from scipy import special

from workbench.errors import Caution, quoted
from workbench.evidence.mis_modelling import mis_modelling_cautions
from workbench.evidence.odds import compare, posteriors
from workbench.evidence.results import (
    AlternativeEvidence,
    AlternativeFactor,
    Comparison,
    Estimate,
    Evidence,
    ScaledPrior,
    Weighing,
)
from workbench.hypotheses.alternatives import Variant, choice_words, in_doubt, variants_of
from workbench.hypotheses.analysis import Analysis

Engine = Callable[[Analysis, int], Weighing]

# An evidence that is not established may be wrong by more than it says. It is passed over only if its share
# stays below the second number even where it is too small by the first, and by 5 of its errors.
DISTRUST = 10.0
NEGLIGIBLE = 1e-3
_ERRORS = 5.0
# Alternatives whose ln B differ by more are worth a caution [nats].
_FAR = 1.0


@dataclass(frozen=True, slots=True, eq=False)
class VariantWeighing:
    """A variant with what weighing it found."""

    variant: Variant
    weighing: Weighing


def weigh_variants(analysis: Analysis, seed: int, engine: Engine) -> Weighing:
    """Return the weighing of an analysis whose hypotheses are averages over alternatives.

        Z = sum over combinations k of P(k) Z_k,   error of ln Z = sqrt( sum_k (P(k) Z_k/Z)^2 e_k^2 )

    Args:
        analysis: everything declared, with observed counts and alternatives.
        seed: where every random number comes from; each variant has a seed of its own, made from it.
        engine: weighs an analysis without alternatives with a seed.

    Returns:
        Averaged evidences with those of each alternative, comparisons of the averages and under each
        alternative alone, posterior probabilities, and cautions.

    Raises:
        InputError: if a region has no observed counts.

    Source:
        J.A. Hoeting et al., Bayesian model averaging, Stat. Sci. 14 (1999) 382; from memory.
        First-order propagation of the errors of ln Z_k.
    """
    weighed = [
        VariantWeighing(variant, engine(variant.analysis, variant_seed(seed, place)))
        for place, variant in enumerate(variants_of(analysis))
    ]
    return combined(analysis, weighed, seed)


def combined(analysis: Analysis, weighed: Sequence[VariantWeighing], seed: int) -> Weighing:
    """Return the average of weighings of all variants of an analysis.

    Args:
        analysis: everything declared.
        weighed: each of its variants with its weighing.
        seed: the seed that every random number came from.

    Returns:
        One weighing, as `weigh_variants` describes it.
    """
    names = [one.name for one in analysis.hypotheses]
    evidences = tuple(
        averaged(name, _evidences(analysis, weighed, place)) for place, name in enumerate(names)
    )
    priors = np.array([hypothesis.prior for hypothesis in analysis.hypotheses], dtype=float)
    comparisons = tuple(
        _comparison(analysis, weighed, evidences, place, float(priors[place] / priors[0]))
        for place in range(1, len(names))
    )
    cautions = dict.fromkeys(
        Caution(caution.code, f"With {quoted(one.variant.name)}: {caution.text}")
        for one in weighed
        for caution in one.weighing.cautions
        if not caution.code.startswith("distortion-")  # said of the average, not of each alternative
    )
    probabilities = posteriors(evidences, priors / priors.sum())
    return Weighing(
        evidences,
        probabilities,
        comparisons,
        seed,
        (
            *cautions,
            *mis_modelling_cautions(analysis, probabilities),
            *(caution for one in comparisons for caution in _dependence(one)),
        ),
    )


def _dependence(comparison: Comparison) -> Iterator[Caution]:
    """Yield a caution where ln B under one alternative alone is far from that under another."""
    known = [
        (one.ln_bayes_factor, one.name)
        for one in comparison.alternatives
        if one.established and one.ln_bayes_factor is not None
    ]
    if known and max(known)[0] - min(known)[0] > _FAR:
        (low, lowest), (high, highest) = min(known), max(known)
        yield Caution(
            "depends-on-the-background",
            f"{quoted(comparison.hypothesis)} against {quoted(comparison.against)}: ln B is {_signed(low)} "
            f"if {quoted(lowest)} is known to hold and {_signed(high)} if {quoted(highest)} is. The answer "
            "is as good as the list of alternatives and their prior probabilities.",
        )


def _signed(value: float) -> str:
    return f"{value:.2f}".replace("-", "−")


def variant_seed(seed: int, place: int) -> int:
    """Return the seed of a variant, so that the errors of two variants have nothing in common.

    Args:
        seed: the seed given.
        place: the variant's place among all.
    """
    return int(np.random.SeedSequence(seed, spawn_key=(place,)).generate_state(1)[0])


def averaged(hypothesis: str, parts: Sequence[AlternativeEvidence]) -> Evidence:
    """Return the evidence of a hypothesis from those of its alternatives.

    It is established if every alternative's evidence is. One that is not may be passed over only where it
    cannot matter: if it has an estimate, and its share of the average would stay below 0.001 even if the
    largest estimate were too small by 10 nats and 5 of its errors; that share is then added to the error.

    Args:
        hypothesis: its name.
        parts: each alternative with its prior probability and evidence; priors add up to 1.

    Returns:
        The average, with the alternatives and their posterior probabilities; the evidence itself where there
        is only one.
    """
    if len(parts) == 1:
        return parts[0].evidence
    kept = [one for one in parts if one.evidence.established and one.evidence.ln_evidence is not None]
    doubtful = [one for one in parts if one not in kept]
    shares = [_largest_share(one, kept) for one in doubtful]
    reasons = [
        f"with {quoted(one.name)}, {one.evidence.reason}"
        for one, share in zip(doubtful, shares, strict=True)
        if not share < NEGLIGIBLE
    ]
    if reasons:
        return _not_established(hypothesis, parts, "; ".join(reasons))
    values = np.array([one.evidence.ln_evidence for one in kept], dtype=float)
    errors = np.array([one.evidence.error or 0.0 for one in kept])
    priors = np.array([one.prior for one in kept])
    value = float(special.logsumexp(values, b=priors))
    found = posteriors(tuple(one.evidence for one in kept), priors / priors.sum())
    weights = np.array([one.probability for one in found], dtype=float)
    error = float(np.sqrt(((weights * errors) ** 2).sum())) + sum(shares)
    chances = {
        one.name: (posterior.probability, posterior.error) for one, posterior in zip(kept, found, strict=True)
    }
    with_posteriors = tuple(
        replace(one, posterior=chances[one.name][0], posterior_error=chances[one.name][1])
        if one.name in chances
        else one
        for one in parts
    )
    return Evidence(hypothesis, value, error, True, "", (_estimate(kept, value, error),), with_posteriors)


def likeliest(variants: Sequence[Variant], evidence: Evidence) -> Variant:
    """Return the variant with the largest prior times evidence, established or not.

    Args:
        variants: those of a hypothesis.
        evidence: that hypothesis' average over them.
    """
    heights = {
        one.name: np.log(one.prior) + one.evidence.ln_evidence
        for one in evidence.alternatives
        if one.evidence.ln_evidence is not None
    }
    return max(variants, key=lambda one: heights.get(one.name, -np.inf))


def _largest_share(doubtful: AlternativeEvidence, kept: Sequence[AlternativeEvidence]) -> float:
    """Return the largest share of the average that an evidence in doubt could conceivably have."""
    estimates = doubtful.evidence.estimates
    if not estimates or not kept:
        return float("inf")
    highest = max(one.ln_evidence + _ERRORS * one.error for one in estimates) + DISTRUST
    sure = special.logsumexp(
        [one.evidence.ln_evidence for one in kept], b=np.array([one.prior for one in kept])
    )
    return float(np.exp(min(highest + np.log(doubtful.prior) - float(sure), 700.0)))


def _not_established(hypothesis: str, parts: Sequence[AlternativeEvidence], reason: str) -> Evidence:
    values = [one.evidence.ln_evidence for one in parts]
    known = [value for value in values if value is not None]
    if len(known) < len(values):
        return Evidence(hypothesis, None, None, False, reason, (), tuple(parts))
    value = float(special.logsumexp(known, b=np.array([one.prior for one in parts])))
    weights = np.exp(np.array(known) - value) * np.array([one.prior for one in parts])
    errors = np.array([one.evidence.error or 0.0 for one in parts])
    error = float(np.sqrt(((weights * errors) ** 2).sum()))
    estimates = (_estimate(parts, value, error),)
    return Evidence(hypothesis, value, error, False, reason, estimates, tuple(parts))


def _estimate(parts: Sequence[AlternativeEvidence], value: float, error: float) -> Estimate:
    """Return the average as an estimate: with the worst k-hat and all the points of what it is made of."""
    reported = [one.evidence.estimates[-1] for one in parts if one.evidence.estimates]
    k_hats = [one.k_hat for one in reported if one.k_hat is not None]
    return Estimate("average", value, error, max(k_hats, default=None), sum(one.draws for one in reported))


def _evidences(
    analysis: Analysis, weighed: Sequence[VariantWeighing], place: int
) -> tuple[AlternativeEvidence, ...]:
    """Return a hypothesis' evidence under each choice of what it uses, priors summed over the rest."""
    used = [process.name for process in in_doubt(analysis, analysis.hypotheses[place].name)]
    found: dict[str, AlternativeEvidence] = {}
    for one in weighed:
        name = _name(one.variant.choice, used)
        if name in found:
            found[name] = replace(found[name], prior=found[name].prior + one.variant.prior)
        else:
            found[name] = AlternativeEvidence(name, one.variant.prior, one.weighing.evidences[place])
    return tuple(found.values())


def _name(choice: Mapping[str, str], used: Sequence[str]) -> str:
    return choice_words({process: choice[process] for process in used})


def _comparison(
    analysis: Analysis,
    weighed: Sequence[VariantWeighing],
    evidences: Sequence[Evidence],
    place: int,
    prior_odds: float,
) -> Comparison:
    names = {one.name for index in (0, place) for one in in_doubt(analysis, analysis.hypotheses[index].name)}
    used = [process.name for process in analysis.processes if process.name in names]
    alone: dict[str, AlternativeFactor] = {}
    for one in weighed:
        comparison = one.weighing.comparisons[place - 1]
        name = _name(one.variant.choice, used)
        before = alone[name].prior if name in alone else 0.0
        alone[name] = AlternativeFactor(
            name,
            before + one.variant.prior,
            comparison.ln_bayes_factor,
            comparison.ln_bayes_factor_error,
            comparison.established,
        )
    return replace(
        compare(evidences[place], evidences[0], prior_odds),
        sensitivity=_sensitivity(weighed, evidences, place),
        alternatives=tuple(alone.values()) if len(alone) > 1 else (),
    )


def _sensitivity(
    weighed: Sequence[VariantWeighing], evidences: Sequence[Evidence], place: int
) -> tuple[ScaledPrior, ...]:
    """Return ln B of the averages with each strength's prior half and twice as wide."""
    against = evidences[0].ln_evidence
    lists = [one.weighing.comparisons[place - 1].sensitivity for one in weighed]
    found = []
    for index, first in enumerate(lists[0]):
        sides: list[float | None] = []
        for side in ("halved", "doubled"):
            terms = [
                (one.variant.prior, one.weighing.evidences[0].ln_evidence, getattr(given[index], side))
                for one, given in zip(weighed, lists, strict=True)
                if index < len(given)
            ]
            known = [(prior, base + change) for prior, base, change in terms if None not in (base, change)]
            if against is None or len(known) < len(weighed):
                sides.append(None)
            else:
                priors, values = zip(*known, strict=True)
                sides.append(float(special.logsumexp(values, b=np.array(priors))) - against)
        found.append(ScaledPrior(first.parameter, first.prior, *sides))
    return tuple(found)
