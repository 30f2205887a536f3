"""From an analysis to what its priors do: curve, families, bounds, least prior probability, powers."""

from __future__ import annotations

from collections.abc import Callable, Iterator

import numpy as np
import numpy.typing as npt

from workbench.evidence.formulas.p_value_bound import ln_largest_from_ln_p
from workbench.evidence.formulas.scales import JEFFREYS, KASS_RAFTERY
from workbench.evidence.prior_choice.averages import Average, average
from workbench.evidence.prior_choice.bounds import (
    Bound,
    largest_never_rising,
    largest_of_any,
    largest_with_peak,
)
from workbench.evidence.prior_choice.case import Case, weighed_case
from workbench.evidence.prior_choice.cautions import examination_cautions
from workbench.evidence.prior_choice.curve import StrengthCurve
from workbench.evidence.prior_choice.families import Family, families
from workbench.evidence.prior_choice.local_p import LocalP, differs_by, local_p
from workbench.evidence.prior_choice.reference import events_of, first_equal, reference_family
from workbench.evidence.prior_choice.results import DeclaredPrior, PriorSensitivity
from workbench.evidence.prior_choice.tracing import trace
from workbench.evidence.prior_choice.verdicts import (
    Crossing,
    FamilyCurve,
    NeededPrior,
    crossings,
    needed_prior,
)
from workbench.evidence.results import largest_gap
from workbench.hypotheses.analysis import Analysis

Array = npt.NDArray[np.float64]
Say = Callable[[str], None]

POSTERIOR = 0.99
SCALES = (KASS_RAFTERY, JEFFREYS)
STEPS = 6  # means between a mean and its double
_OCTAVES = 3
_PREDICTION = 1.0


@np.errstate(all="ignore")  # an impossible point has ln probability -inf
def prior_sensitivity(
    analysis: Analysis,
    *,
    hypothesis: str | None = None,
    parameter: str | None = None,
    posterior: float = POSTERIOR,
    seed: int = 1,
    say: Say = lambda _: None,
) -> PriorSensitivity:
    """Return how the Bayes factor depends on the strength's prior and on every nuisance prior.

    The strength is held at numbers and each evidence made as `weigh` makes it; its ratio R to the other
    hypothesis' holds no prior of the strength, and every prior's Bayes factor is an average of R.

    Args:
        analysis: everything declared, with observed counts.
        hypothesis: the hypothesis with the strength; None takes the first that has one.
        parameter: the strength; None takes the hypothesis' first.
        posterior: the posterior probability that is wanted, for the least prior one; between 0 and 1.
        seed: where every random number comes from; ln B is that of `weigh` with the same seed.
        say: told how it goes on.

    Returns:
        ln R, ln B by family and mean, the largest ln B of classes of priors, crossings of published
        boundaries, the least prior probability, power-scaling, and cautions.

    Raises:
        InputError: if a region has no observed counts, or there is no such hypothesis or strength.

    Source:
        Sensitivity to the prior's scale: R.D. Cousins, The Jeffreys-Lindley paradox and discovery criteria in
        high energy physics, Synthese 194 (2017) 395; from memory. The parts name theirs.
    """
    case = weighed_case(analysis, hypothesis, parameter, seed, say)
    reason = case.doubt()
    if reason:
        return _refused(case, reason, posterior, seed)
    child = np.random.SeedSequence(seed, spawn_key=(len(analysis.hypotheses),))
    name = case.comparison.hypothesis
    scale = first_equal(case.weighed.model, case.strength)
    is_nested = differs_by(analysis, name, case.comparison.against, case.strength)
    curve = trace(analysis, name, case.strength, case.evidences[0], child, is_nested, scale, say)
    declared = _declared(case, curve)
    reason = curve.doubt() or _disagreement(case, declared.by_curve)
    if reason:
        return _refused(case, reason, posterior, seed)
    return _examined(case, curve, declared, posterior, seed, say)


def _examined(
    case: Case, curve: StrengthCurve, declared: DeclaredPrior, posterior: float, seed: int, say: Say
) -> PriorSensitivity:
    model, strength = case.weighed.model, case.strength
    means = _means(curve, declared.mean)
    made = families(reference_family(model, strength, float(means[-1])))
    curves = tuple(
        FamilyCurve(one.name, one.words, tuple(average(curve, one.member(float(mean))) for mean in means))
        for one in made
    )
    say("local p-value")
    comparison = case.comparison
    local = local_p(case.analysis, comparison.hypothesis, comparison.against, strength, curve.reach)
    bounds = tuple(_bounds(curve, local))
    return PriorSensitivity(
        strength=strength,
        comparison=comparison,
        evidences=case.evidences,
        reason="",
        declared=declared,
        events=events_of(model, strength),
        curve=curve,
        means=means,
        families=curves,
        bounds=bounds,
        local=local,
        crossings=_crossings(curve, made, curves, means),
        posterior=posterior,
        needed=_needed(case, bounds, posterior),
        scalings=case.power_scalings(say),
        seed=seed,
        cautions=tuple(examination_cautions(case, curve, local)),
    )


def _refused(case: Case, reason: str, posterior: float, seed: int) -> PriorSensitivity:
    """Return what is left where nothing is established: the evidences and the reason."""
    return PriorSensitivity(
        strength=case.strength,
        comparison=case.comparison,
        evidences=case.evidences,
        reason=reason,
        declared=_declared(case, None),
        events=events_of(case.weighed.model, case.strength),
        curve=None,
        means=np.zeros(0),
        families=(),
        bounds=(),
        local=None,
        crossings={},
        posterior=posterior,
        needed=(),
        scalings=(),
        seed=seed,
    )


def _declared(case: Case, curve: StrengthCurve | None) -> DeclaredPrior:
    prior = case.analysis.parameter(case.strength).prior
    by_curve = Average(None, None) if curve is None else average(curve, prior)
    return DeclaredPrior(prior.text(), prior.family, prior.moments.mean, by_curve)


def _disagreement(case: Case, by_curve: Average) -> str:
    """Return how the curve's average differs from the weighed ln B; empty where they agree."""
    value, error = case.comparison.ln_bayes_factor, case.comparison.ln_bayes_factor_error
    if by_curve.ln_bayes_factor is None or value is None:
        return ""
    gap = abs(by_curve.ln_bayes_factor - value)
    limit = largest_gap(by_curve.error, error)
    if gap <= limit:
        return ""
    return f"the average of R over the declared prior and ln B differ by {gap:.2g}, more than {limit:.2g}"


def _means(curve: StrengthCurve, declared: float) -> Array:
    """Return means from an eighth of the smallest to eight times the largest of what matters.

    What matters are the declared prior's mean and the best strength, or where R has fallen by a factor e if
    there is no excess; all in steps from the declared mean.
    """
    fine, values = curve.edges, curve.at(curve.edges)
    best = float(fine[int(np.argmax(values))])
    if not curve.is_ended:
        best = declared
    elif best <= 1e-3 * curve.reach:
        best = float(fine[int(np.argmax(values < values[0] - 1.0))]) or declared
    low, high = np.log2(np.array([min(best, declared), max(best, declared)]) / declared)
    first = int(np.floor(STEPS * (low - _OCTAVES)))
    last = int(np.ceil(STEPS * (high + _OCTAVES)))
    return np.asarray(declared * 2.0 ** (np.arange(first, last + 1) / STEPS))


def _bounds(curve: StrengthCurve, local: LocalP | None) -> Iterator[Bound]:
    yield largest_of_any(curve)
    yield largest_with_peak(curve, _PREDICTION)
    yield largest_never_rising(curve)
    if local is not None:
        yield Bound("p-value", float(ln_largest_from_ln_p(local.ln_p)), 0.0)


def _crossings(
    curve: StrengthCurve, made: tuple[Family, ...], curves: tuple[FamilyCurve, ...], means: Array
) -> dict[str, tuple[Crossing, ...]]:
    found: dict[str, tuple[Crossing, ...]] = {}
    for scale in SCALES:
        of_scale: list[Crossing] = []
        for family, known in zip(made, curves, strict=True):

            def at(mean: float, family: Family = family) -> Average:
                return average(curve, family.member(mean))

            of_scale += crossings(family.name, means, known.averages, scale, at)
        found[scale.name] = tuple(of_scale)
    return found


def _needed(case: Case, bounds: tuple[Bound, ...], posterior: float) -> tuple[NeededPrior, ...]:
    value, error = case.comparison.ln_bayes_factor or 0.0, case.comparison.ln_bayes_factor_error or 0.0
    # The p-value's bound is no Bayes factor of any prior, and where a place was searched for it is too large.
    of_priors = [bound for bound in bounds if bound.low is not None]
    sources = [("as declared", value, error), *((b.name, b.ln_bayes_factor, b.error) for b in of_priors)]
    return tuple(needed_prior(*source, posterior) for source in sources)
