"""The updating ratio: how the counts weigh signal against background only at each value of its parameters.

R(x) = p(n | hypothesis, signal parameters held at x)/p(n | background only). Priors of nuisance parameters
enter, those of signal parameters do not: a Bayes factor is its average over them, whichever they are.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from workbench.errors import InputError, Problem, quoted
from workbench.evidence.quadrature import integrate
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
from workbench.evidence.weigh import Weighed, observed_counts, weigh_hypothesis
from workbench.hypotheses.analysis import Analysis
from workbench.likelihood.model import Model, compile_model

_FEW_BINS = 700


@np.errstate(all="ignore")  # an impossible point has ln probability -inf
def scan(
    analysis: Analysis, over: Sequence[str] | None = None, *, hypothesis: str | None = None, seed: int = 1
) -> Scan:
    """Return the updating ratio over signal parameters, those not named averaged over their stated priors.

        R(x) = p(n | hypothesis, x)/p(n | background only)

    At nodes over all signal parameters the others are brought to their maximum and integrated by Laplace's
    method, which draws around it then correct; all nodes share their draws. What lies between is
    interpolated. Its average over the stated priors is held against the engine's Bayes factor, and R at
    points between the nodes against the engine with the parameters held there.

    Args:
        analysis: everything declared, with observed counts.
        over: signal parameters; None for all of them, which makes R free of every signal prior.
        hypothesis: which; None for the first after background only that has these parameters.
        seed: where every random number comes from.

    Returns:
        R with its errors; `reprior` makes a Bayes factor of it under any prior.

    Raises:
        InputError: if a region has no observed counts, a name is no signal parameter of the hypothesis, or
            backgrounds have alternatives.

    Limits:
        At most three signal parameters, of which one may be a strength with nodes of its own.

    Source:
        G. D'Agostini, Bayesian Reasoning in Data Analysis (2003), chapter 13, "relative belief updating
        ratio"; from memory.
    """
    chosen = chosen_hypothesis(analysis, over, hypothesis)
    names = refuse_strangers(analysis, chosen, over)
    place = [one.name for one in analysis.hypotheses].index(chosen)
    children = np.random.SeedSequence(seed).spawn(len(analysis.hypotheses) + 2)
    first = weigh_hypothesis(compile_model(analysis, analysis.hypotheses[0].name), children[0])
    near = first.grid.mode if first.grid is not None else {}
    model = compile_model(analysis, chosen)
    weighed = weigh_hypothesis(model, children[place], near=near)
    if first.evidence.ln_evidence is None or weighed.evidence.ln_evidence is None:
        return _nothing(analysis, names, first, weighed, seed)
    return _scanned(analysis, names, first, weighed, children[-2:], seed)


def _scanned(
    analysis: Analysis,
    over: tuple[str, ...],
    first: Weighed,
    weighed: Weighed,
    children: list[np.random.SeedSequence],
    seed: int,
) -> Scan:
    model = weighed.model
    held_at = _holder(weighed, children[0])
    anchor = anchor_of(held_at, first)
    surface, standing = build(held_at, _panels(held_at), _open_strength(held_at), anchor.reference)
    if anchor.is_nested:
        surface = _pinned(surface, model)
    else:
        reference = anchor.reference if anchor.reference is not None else _best(standing.held)
        shift, doubt = shift_of(first, reference)
        surface = replace(surface, ln_ratio=surface.ln_ratio + shift, error=np.hypot(surface.error, doubt))
    checks = checks_of(analysis, model.hypothesis, surface, first, children[1])
    stated = {model.coordinates[index].name: model.coordinates[index].prior for index in model.signal}
    rest = {name: prior for name, prior in stated.items() if name not in over}
    ln_b, error = _sampled(first, weighed)
    found = Scan(
        model.hypothesis,
        first.model.hypothesis,
        over,
        averaged(surface, rest),
        {name: stated[name] for name in over},
        rest,
        _units(model),
        _prior_odds(analysis, model.hypothesis),
        anchor.is_nested,
        ln_b,
        error,
        True,
        "",
        seed,
        len(held_at.draws.whitened),
        checks,
    )
    reason = disagreement(found, surface, first, weighed)
    return replace(widened(found), established=not reason, reason=reason)


def _nothing(analysis: Analysis, over: tuple[str, ...], first: Weighed, weighed: Weighed, seed: int) -> Scan:
    """Return a scan without a surface, where one of the two hypotheses has no evidence at all."""
    model = weighed.model
    stated = {model.coordinates[index].name: model.coordinates[index].prior for index in model.signal}
    one = first if first.evidence.ln_evidence is None else weighed
    return Scan(
        model.hypothesis,
        first.model.hypothesis,
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
        f"{quoted(one.model.hypothesis)}: {one.evidence.reason}",
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


def _sampled(first: Weighed, weighed: Weighed) -> tuple[float | None, float | None]:
    one, other = weighed.evidence, first.evidence
    if one.ln_evidence is None or other.ln_evidence is None:
        return None, None
    return one.ln_evidence - other.ln_evidence, float(np.hypot(one.error or 0.0, other.error or 0.0))


def _prior_odds(analysis: Analysis, hypothesis: str) -> float:
    return float(analysis.hypothesis(hypothesis).prior / analysis.hypotheses[0].prior)
