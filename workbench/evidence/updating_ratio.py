"""The updating ratio: how the counts weigh signal against background only at each value of its parameters.

R(x) = p(n | hypothesis, signal parameters held at x)/p(n | background only). Priors of nuisance parameters
enter, those of signal parameters do not: a Bayes factor is its average over them, whichever they are.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from workbench.errors import InputError, Problem, quoted
from workbench.evidence.averaging import variant_seed
from workbench.evidence.integral.quadrature import integrate
from workbench.evidence.ratio.asking import chosen_hypothesis, refuse_strangers
from workbench.evidence.ratio.averages import averaged
from workbench.evidence.ratio.building import MOST_COLUMNS, build, first_panels
from workbench.evidence.ratio.checking import anchor_of, checks_of, disagreement, shift_of, widened
from workbench.evidence.ratio.held import FEWEST_DRAWS, MANY_DRAWS, Held, Holder, drawn, holder
from workbench.evidence.ratio.panels import Panels
from workbench.evidence.ratio.reaching import ranges_of
from workbench.evidence.ratio.results import Scan
from workbench.evidence.ratio.strengths import Strengths
from workbench.evidence.ratio.surface import Surface
from workbench.evidence.ratio.variants import Part, combined, ratio_of
from workbench.evidence.weigh import Weighed, observed_counts, weigh_hypothesis
from workbench.hypotheses.alternatives import Variant, variants_of
from workbench.hypotheses.analysis import Analysis
from workbench.likelihood.model import Model, compile_model

_FEW_BINS = 700
_NODES, _CHECKS = 1001, 1002  # whose random numbers these are


@np.errstate(all="ignore")  # an impossible point has ln probability -inf
def scan(
    analysis: Analysis, over: Sequence[str] | None = None, *, hypothesis: str | None = None, seed: int = 1
) -> Scan:
    """Return the updating ratio over signal parameters, those not named averaged over their stated priors.

        R(x) = p(n | hypothesis, x)/p(n | background only)

    At nodes over all signal parameters the others are brought to their maximum and integrated by Laplace's
    method, which draws around it then correct; all nodes share their draws. What lies between is
    interpolated. Its average over the stated priors is held against the engine's Bayes factor, and R at
    points between the nodes against the engine with the parameters held there. Where backgrounds have
    alternatives, R is the ratio of the averages over them.

    Args:
        analysis: everything declared, with observed counts.
        over: signal parameters; None for all of them, which makes R free of every signal prior.
        hypothesis: which; None for the first after background only that has these parameters.
        seed: where every random number comes from.

    Returns:
        R with its errors; `reprior` makes a Bayes factor of it under any prior.

    Raises:
        InputError: if a region has no observed counts, a name is no signal parameter of the hypothesis, or
            the signal itself has alternatives with other parameters.

    Limits:
        At most three signal parameters, of which one may be a strength with nodes of its own.

    Source:
        G. D'Agostini, Bayesian Reasoning in Data Analysis (2003), chapter 13, "relative belief updating
        ratio"; from memory.
    """
    chosen = chosen_hypothesis(analysis, over, hypothesis)
    names = refuse_strangers(analysis, chosen, over)
    variants = variants_of(analysis)
    is_alone = len(variants) == 1
    seeds = [seed if is_alone else variant_seed(seed, place) for place in range(len(variants))]
    parts = [
        _weighed(variant, chosen, np.random.SeedSequence(its_seed))
        for variant, its_seed in zip(variants, seeds, strict=True)
    ]
    sampled = ratio_of(parts, [part.weighed.evidence for part in parts])
    if sampled is None:
        return _nothing(analysis, names, parts, seed)
    wholes = [
        _whole(part, np.random.SeedSequence(its_seed, spawn_key=(_NODES,)))
        for part, its_seed in zip(parts, seeds, strict=True)
    ]
    surface = combined(parts, [whole.surface for whole in wholes])
    is_nested = all(whole.is_nested for whole in wholes)
    if is_nested:
        surface = _pinned(surface, parts[0].weighed.model)
    checks = checks_of(parts, surface, np.random.SeedSequence(seed, spawn_key=(_CHECKS,)))
    found = replace(
        _nothing(analysis, names, parts, seed),
        is_nested=is_nested,
        ln_bayes_factor=sampled.ln_ratio,
        ln_bayes_factor_error=sampled.error,
        draws=wholes[0].draws,
        checks=checks,
    )
    found = replace(found, surface=averaged(surface, dict(found.averaged)), established=True, reason="")
    reason = disagreement(found, surface, parts)
    return replace(widened(found), established=not reason, reason=reason)


@dataclass(frozen=True, slots=True, eq=False)
class _Whole:
    """R over all signal parameters under one alternative of the backgrounds."""

    surface: Surface
    is_nested: bool
    draws: int


def _weighed(variant: Variant, chosen: str, seed: np.random.SeedSequence) -> Part:
    """Return both evidences, as `weigh` has them with this seed."""
    analysis = variant.analysis
    names = [one.name for one in analysis.hypotheses]
    children = seed.spawn(len(names))
    first = weigh_hypothesis(compile_model(analysis, names[0]), children[0])
    near = first.grid.mode if first.grid is not None else {}
    weighed = weigh_hypothesis(compile_model(analysis, chosen), children[names.index(chosen)], near=near)
    return Part(variant.prior, analysis, first, weighed)


def _whole(part: Part, seed: np.random.SeedSequence) -> _Whole:
    held_at = _holder(part.weighed, seed)
    anchor = anchor_of(held_at, part.first)
    surface, standing = build(held_at, _panels(held_at), _open_strength(held_at), anchor.reference)
    if not anchor.is_nested:
        reference = anchor.reference if anchor.reference is not None else _best(standing.held)
        shift, doubt = shift_of(part.first, reference)
        surface = replace(surface, ln_ratio=surface.ln_ratio + shift, error=np.hypot(surface.error, doubt))
    else:
        surface = _pinned(surface, part.weighed.model)
    return _Whole(surface, anchor.is_nested, len(held_at.draws.whitened))


def _nothing(analysis: Analysis, over: tuple[str, ...], parts: Sequence[Part], seed: int) -> Scan:
    """Return a scan without a surface: what is known before there is one."""
    model = parts[0].weighed.model
    stated = {model.coordinates[index].name: model.coordinates[index].prior for index in model.signal}
    missing = [
        one for part in parts for one in (part.first, part.weighed) if one.evidence.ln_evidence is None
    ]
    reason = f"{quoted(missing[0].model.hypothesis)}: {missing[0].evidence.reason}" if missing else ""
    return Scan(
        model.hypothesis,
        parts[0].first.model.hypothesis,
        over,
        None,
        {name: stated[name] for name in over},
        {name: prior for name, prior in stated.items() if name not in over},
        _units(model),
        _prior_odds(analysis, model.hypothesis),
        False,
        None,
        None,
        False,
        reason,
        seed,
        0,
    )


def _holder(weighed: Weighed, seed: np.random.SeedSequence) -> Holder:
    model = weighed.model
    counts = observed_counts(model)
    grid = weighed.grid if weighed.grid is not None else integrate(model, counts)
    if grid is None:
        raise _too_large(model)
    return holder(model, counts, ranges_of(model), drawn(grid, _draws(model), seed))


def _draws(model: Model) -> int:
    """Return the draws a scramble: more where there are few nodes to draw at."""
    is_small = model.signal.size == 1 and model.bins < _FEW_BINS
    return MANY_DRAWS if is_small else FEWEST_DRAWS


def _panels(held_at: Holder) -> tuple[Panels, ...]:
    panels = first_panels(held_at)
    if np.prod([float(one.nodes.size) for one in panels]) > MOST_COLUMNS:
        raise _too_large(held_at.model)
    return panels


def _units(model: Model) -> dict[str, str]:
    return {model.coordinates[index].name: model.coordinates[index].unit for index in model.signal}


def _too_large(model: Model) -> InputError:
    names = " and ".join(quoted(model.coordinates[index].name) for index in model.signal)
    return InputError(
        Problem(
            "A surface of too many nodes",
            f"hypothesis {quoted(model.hypothesis)}",
            f"signal parameters {names}",
            "a range that a few thousand nodes resolve",
            "hold some of them with fix, or narrow their priors",
        )
    )


def _open_strength(held_at: Holder) -> Strengths | None:
    """Return the last strength with its range and no nodes yet; None without a strength."""
    inner = held_at.integrand.inner
    if inner is None:
        return None
    coordinate = held_at.model.coordinates[inner]
    nothing = np.zeros(0)
    return Strengths(coordinate.name, *coordinate.prior.support, nothing, nothing, nothing, 0)


def _best(held: Held) -> Held:
    return held.take(np.array([int(np.argmax(held.ln_evidence))]))


def _pinned(surface: Surface, model: Model) -> Surface:
    """Return the surface with R exactly 1, and no error, where every strength is 0."""
    strengths = {
        model.coordinates[index].name for index in model.signal if model.coordinates[index].is_strength
    }
    of_strengths = surface.nodes[:, :, [name in strengths for name in surface.names]]
    is_nothing = (of_strengths == 0.0).all(axis=2)
    ln_ratio, error = (np.where(is_nothing, 0.0, part) for part in (surface.ln_ratio, surface.error))
    return replace(surface, ln_ratio=ln_ratio, error=error)


def _prior_odds(analysis: Analysis, hypothesis: str) -> float:
    return float(analysis.hypothesis(hypothesis).prior / analysis.hypotheses[0].prior)
