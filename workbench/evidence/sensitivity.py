"""How the Bayes factor answers a strength prior, or a distortion, that is half or twice as wide."""

from __future__ import annotations

from dataclasses import replace

from workbench.errors import InputError
from workbench.evidence.drawn import Drawn
from workbench.evidence.draws_reweighted import ln_change_of_draws
from workbench.evidence.exact import linear_rates
from workbench.evidence.exact import ln_evidence as exact_ln_evidence
from workbench.evidence.integral.quadrature import Grid, integrate, integrate_again
from workbench.evidence.results import Evidence, ScaledPrior
from workbench.evidence.reweighting import ln_change
from workbench.hypotheses.priors import Prior
from workbench.likelihood.distortions import resized
from workbench.likelihood.model import Model


def sensitivities(
    model: Model, grid: Grid | None, evidence: Evidence, against: Evidence, drawn: Drawn | None = None
) -> tuple[ScaledPrior, ...]:
    """Return ln B with the prior of each strength, and the size of a distortion, half and twice as wide.

    The quadrature's nodes are summed under the other prior, or made again where they do not reach far enough;
    the change is added to the reported ln B.

    Args:
        model: the compiled hypothesis.
        grid: its quadrature; None where the closed form was used.
        evidence: its evidence.
        against: the evidence that ln B compares it with.
        drawn: the draws that the evidence was made from; None where they are the quadrature's.

    Returns:
        One entry for each signal strength, then one for a distortion; none where ln B itself is missing.
    """
    if evidence.ln_evidence is None or against.ln_evidence is None or model.observed is None:
        return ()
    ln_bayes_factor = evidence.ln_evidence - against.ln_evidence
    base = evidence.ln_evidence if grid is None else grid.ln_evidence
    found = []
    for index, coordinate in enumerate(model.coordinates):
        if not coordinate.is_strength:
            continue
        scaled = (_scaled(model, index, 0.5), _scaled(model, index, 2.0))
        if drawn is None:
            changed = [_ln_evidence(one, grid, index) for one in scaled]
        else:
            changed = [_by_draws(one, drawn, index, coordinate.prior, base) for one in scaled]
        halved, doubled = (None if one is None else ln_bayes_factor + one - base for one in changed)
        found.append(ScaledPrior(coordinate.name, coordinate.prior.text(), halved, doubled))
    if grid is not None and model.analysis.hypothesis(model.hypothesis).distortion is not None:
        found.append(_of_distortion(model, grid, ln_bayes_factor))
    return tuple(found)


def _of_distortion(model: Model, grid: Grid, ln_bayes_factor: float) -> ScaledPrior:
    """Return ln B with a distortion of half and of twice the size, integrated again."""
    halved, doubled = (
        None if again is None else ln_bayes_factor + again.ln_evidence - grid.ln_evidence
        for again in (
            integrate(resized(model, factor), grid.integrand.counts, grid.mode) for factor in (0.5, 2.0)
        )
    )
    distortion = model.analysis.hypothesis(model.hypothesis).distortion
    words = "" if distortion is None else f"{100.0 * distortion.size:.6g} % a term"
    return ScaledPrior("distortion", words, halved, doubled)


def _scaled(model: Model, index: int, factor: float) -> Model | None:
    """Return the model with one prior's width scaled; None where there is no such prior of its family."""
    try:
        prior = model.coordinates[index].prior.scaled(factor)
    except InputError:  # too wide, too narrow or too far to be worked with
        return None
    if prior is None:
        return None
    coordinates = list(model.coordinates)
    coordinates[index] = replace(coordinates[index], prior=prior)
    return replace(model, coordinates=tuple(coordinates))


def _by_draws(model: Model | None, drawn: Drawn, index: int, declared: Prior, base: float) -> float | None:
    """Return ln Z under another prior of one strength, its draws weighted anew."""
    if model is None:
        return None
    change = ln_change_of_draws(drawn, index, declared, model.coordinates[index].prior)
    return None if change is None else base + change


def _ln_evidence(model: Model | None, grid: Grid | None, index: int) -> float | None:
    """Return ln Z under another prior of one strength, by the way it was found before."""
    if model is None or model.observed is None:
        return None
    if grid is None:
        rates = linear_rates(model)
        return None if rates is None else exact_ln_evidence(rates, model.observed)
    if index == grid.integrand.inner:
        change = ln_change(grid, model.coordinates[index].prior)
        return integrate_again(model, grid).ln_evidence if change is None else grid.ln_evidence + change
    again = integrate(model, model.observed, grid.mode)
    return None if again is None else again.ln_evidence
