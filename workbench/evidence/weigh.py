"""From an analysis to evidences, Bayes factors and posterior odds."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from workbench.errors import Caution, InputError, Problem, quoted
from workbench.evidence.agreement import doubt
from workbench.evidence.annealing.exchange import like_signal_cautions
from workbench.evidence.averaging import weigh_variants
from workbench.evidence.drawn import Drawn
from workbench.evidence.empty_bins import empty_bin_cautions
from workbench.evidence.engines import AUTO, answered, refuse_unknown
from workbench.evidence.exact import linear_rates
from workbench.evidence.exact import ln_evidence as exact_ln_evidence
from workbench.evidence.integral.nodes import LEAST_LN_HEIGHT
from workbench.evidence.integral.quadrature import Grid, integrate
from workbench.evidence.integral.ridge import MOST_FOLLOWED
from workbench.evidence.integral.sampling import Sample, sampled
from workbench.evidence.mis_modelling import mis_modelling_cautions
from workbench.evidence.odds import compare, posteriors
from workbench.evidence.one_sided import one_sided_cautions
from workbench.evidence.results import Estimate, Evidence, Weighing
from workbench.evidence.sensitivity import sensitivities
from workbench.hypotheses.alternatives import in_doubt
from workbench.hypotheses.analysis import Analysis
from workbench.likelihood.model import Model, compile_model, impossible_bins

Array = npt.NDArray[np.float64]

_NOWHERE: Mapping[str, float] = {}
# The spread of weights tells their error where four moments are finite: k below 1/4; k-hat is noisy itself.
_EVEN_ENOUGH = 0.3


@dataclass(frozen=True, slots=True, eq=False)
class Weighed:
    """A hypothesis' evidence with what it was made of.

    Attributes:
        model: the compiled hypothesis.
        evidence: the answer.
        grid: the quadrature's nodes; None where the closed form was used.
        sample: the sampling pass; None where the closed form was used.
        drawn: another engine's draws, where that made the answer.
    """

    model: Model
    evidence: Evidence
    grid: Grid | None = None
    sample: Sample | None = None
    drawn: Drawn | None = None


@np.errstate(all="ignore")  # an impossible point has ln probability -inf
def weigh(analysis: Analysis, *, seed: int = 1, engine: str = AUTO, closed_forms: bool = True) -> Weighing:
    """Return evidences, Bayes factors and posterior odds of every hypothesis.

    Args:
        analysis: everything declared, with observed counts.
        seed: where every random number comes from.
        engine: "standard" is the closed form, or quadrature and sampling; "auto" the same, and annealed
            populations where it establishes nothing; "annealed" and "nested" have these make every number.
        closed_forms: False keeps to the numerical estimators even where a closed form holds.

    Returns:
        Evidences with errors and their estimators (averages over the alternatives of the backgrounds, where
        there are some), comparisons against the first hypothesis, posterior probabilities, and cautions.

    Raises:
        InputError: if a region has no observed counts, for an unknown engine, or where dynesty is needed and
            not installed.

    Source:
        R.E. Kass, A.E. Raftery, Bayes factors, J. Am. Stat. Assoc. 90 (1995) 773; from memory. The estimators
        name theirs.
    """
    refuse_unknown(engine)
    if in_doubt(analysis):
        return weigh_variants(
            analysis,
            seed,
            lambda one, its_seed: weigh(one, seed=its_seed, engine=engine, closed_forms=closed_forms),
        )
    children = np.random.SeedSequence(seed).spawn(len(analysis.hypotheses))
    weighed: list[Weighed] = []
    for hypothesis, child in zip(analysis.hypotheses, children, strict=True):
        near = weighed[0].grid.mode if weighed and weighed[0].grid is not None else {}
        model = compile_model(analysis, hypothesis.name)
        weighed.append(_weighed_by(engine, model, child, closed_forms=closed_forms, near=near))
    evidences = tuple(one.evidence for one in weighed)
    priors = np.array([hypothesis.prior for hypothesis in analysis.hypotheses], dtype=float)
    comparisons = tuple(
        replace(
            compare(evidences[index], evidences[0], float(priors[index] / priors[0])),
            sensitivity=sensitivities(one.model, one.grid, one.evidence, evidences[0], one.drawn),
        )
        for index, one in enumerate(weighed)
        if index > 0
    )
    grids = [one.grid for one in weighed]
    probabilities = posteriors(evidences, priors / priors.sum())
    return Weighing(
        evidences,
        probabilities,
        comparisons,
        seed,
        (
            *(caution for one in weighed for caution in (*_cautions(one), *like_signal_cautions(one.model))),
            *mis_modelling_cautions(analysis, probabilities),
            *one_sided_cautions(analysis, grids),
            *empty_bin_cautions([one.model for one in weighed], grids, comparisons),
        ),
    )


def _weighed_by(
    engine: str,
    model: Model,
    seed: np.random.SeedSequence,
    *,
    closed_forms: bool,
    near: Mapping[str, float],
) -> Weighed:
    """Return one hypothesis' evidence by the engine asked for."""
    standard = weigh_hypothesis(model, seed, closed_forms=closed_forms, near=near)
    is_cut = standard.grid is not None and standard.grid.columns.is_cut
    if engine == AUTO and is_cut:  # no engine reaches where numbers end
        return standard
    evidence, drawn = answered(engine, model, standard.evidence, seed)
    return replace(standard, evidence=evidence, drawn=drawn)


def observed_counts(model: Model) -> Array:
    """Return (bin,) observed counts, or refuse an analysis that has none."""
    if model.observed is not None:
        return model.observed
    missing = [region.name for region in model.analysis.regions if region.table.observed is None]
    raise InputError(
        *(
            Problem(
                what="a region has no observed counts",
                where=f"region {quoted(name)}",
                found='no column "observed"',
                expected="observed counts in every bin",
                remedy='add a column "observed", or use oddsbench check, which needs none',
            )
            for name in missing
        )
    )


def weigh_hypothesis(
    model: Model,
    seed: np.random.SeedSequence,
    *,
    closed_forms: bool = True,
    near: Mapping[str, float] = _NOWHERE,
) -> Weighed:
    """Return one hypothesis' evidence: in closed form where it holds, else by two estimators that must agree.

    Where they don't, or where the weights' tail is so heavy that their spread may tell too small an error,
    both are made once more with the most bent nuisance direction followed node by node.

    Args:
        model: the compiled hypothesis.
        seed: where its random numbers come from.
        closed_forms: False keeps to the numerical estimators.
        near: standard coordinates by name to start from, such as another hypothesis' mode.

    Returns:
        The evidence with grid and sample.

    Raises:
        InputError: if a region has no observed counts.
    """
    counts = observed_counts(model)
    impossible = impossible_bins(model)
    if impossible.any():
        return Weighed(model, _impossible(model, impossible))
    if model.size == 0:
        value = float(model.ln_likelihood(model.seeds(np.zeros((1, 0))), counts)[0])
        return Weighed(model, _exactly(model, value))
    rates = linear_rates(model) if closed_forms else None
    exact = exact_ln_evidence(rates, counts) if rates is not None else None
    if exact is not None and np.isfinite(exact):
        return Weighed(model, _exactly(model, exact))
    grid = integrate(model, counts, near)
    if grid is None:
        return _unmanageable(model, "its signal coordinates need more nodes than can be held")
    try:
        return _estimated(model, grid, seed, near)
    except np.linalg.LinAlgError:
        return _unmanageable(model, "no draws can be made from what the quadrature found")


def _unmanageable(model: Model, what: str) -> Weighed:
    reason = f"{what}, or its numbers are too far apart; fix some parameters, or narrow their priors"
    return Weighed(model, Evidence(model.hypothesis, None, None, False, reason, ()))


def _estimated(model: Model, grid: Grid, seed: np.random.SeedSequence, near: Mapping[str, float]) -> Weighed:
    """Return the two estimators' answer, made once more along a ridge where that helps."""
    drawn = sampled(grid, seed)
    first = Weighed(model, _agreed(model, grid, drawn), grid, drawn)
    has_ridge = grid.bending is None or grid.bending.ridge is not None
    is_hopeless = not drawn.k_hat < np.inf or grid.integrand.nuisance.size > MOST_FOLLOWED
    if has_ridge or is_hopeless or (first.evidence.established and drawn.k_hat < _EVEN_ENOUGH):
        return first
    again = integrate(model, grid.integrand.counts, near, along_ridge=True)
    if again is None:
        return first
    redrawn = sampled(again, seed)
    second = Weighed(model, _agreed(model, again, redrawn), again, redrawn)
    is_better = redrawn.k_hat < drawn.k_hat or not first.evidence.established
    return second if second.evidence.established and is_better else first


def _exactly(model: Model, value: float) -> Evidence:
    estimate = Estimate("closed form", value, 0.0)
    return Evidence(model.hypothesis, value, 0.0, True, "", (estimate,))


def _agreed(model: Model, grid: Grid, drawn: Sample) -> Evidence:
    """Return the evidence of the sampling pass, established or not."""
    name = "quadrature" if model.signal.size else "Laplace"
    estimates = (
        Estimate(name, grid.ln_evidence, grid.error, None, grid.evaluations),
        Estimate("sampling", drawn.ln_evidence, drawn.error, drawn.k_hat, drawn.ln_weights.size),
    )
    reason = doubt(grid, drawn)
    finite = bool(np.isfinite(drawn.ln_evidence))
    return Evidence(
        model.hypothesis,
        drawn.ln_evidence if finite else None,
        drawn.error if finite else None,
        not reason,
        reason,
        tuple(one for one in estimates if one.ln_evidence > LEAST_LN_HEIGHT and np.isfinite(one.error)),
    )


def _impossible(model: Model, impossible: npt.NDArray[np.bool_]) -> Evidence:
    names = ", ".join(bin_names(model, np.flatnonzero(impossible)))
    reason = (
        f"no parameter value can produce the events observed in {names}; "
        "if the prediction there is an empty simulation, set empty_bin_events in the region of the analysis "
        "file (from a histogram alone, save one first with --save)"
    )
    return Evidence(model.hypothesis, None, None, False, reason, ())


def bin_names(model: Model, bins: npt.NDArray[np.intp]) -> list[str]:
    """Return bins in words: region and range."""
    names = []
    start = 0
    for region in model.analysis.regions:
        binning = region.table.binning
        for index in bins:
            if start <= index < start + binning.number:
                low, high = binning.low[index - start], binning.high[index - start]
                unit = f" {region.unit}" if region.unit else ""
                names.append(f"region {quoted(region.name)} from {low:g} to {high:g}{unit}")
        start += binning.number
    return names


def _cautions(one: Weighed) -> list[Caution]:
    found = []
    if one.grid is not None and not one.grid.columns.converged.all():
        share = 1.0 - float(one.grid.columns.converged.mean())
        found.append(
            Caution(
                "unfinished-nodes",
                f"{quoted(one.model.hypothesis)}: {share:.1%} of the quadrature's nodes did not converge.",
            )
        )
    return found
