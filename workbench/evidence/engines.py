"""Which engine makes an evidence, and whether its number is established beside the others.

The standard pair, quadrature and sampling, comes first wherever an engine is not asked for by name. Where it
can't lay out its nodes, or its estimators don't agree, populations are annealed.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from workbench.errors import InputError, Problem, nearest, quoted
from workbench.evidence.annealing.annealed import anneal, most_evaluations, terrain_of
from workbench.evidence.drawn import Drawn
from workbench.evidence.integral.pareto import largest_allowed
from workbench.evidence.nested import sample_nested
from workbench.evidence.other_maxima import OTHER_MAXIMUM
from workbench.evidence.results import Estimate, Evidence, largest_gap
from workbench.likelihood.model import Model, impossible_bins

AUTO, STANDARD, ANNEALED, NESTED = "auto", "standard", "annealed", "nested"
ENGINES = (AUTO, STANDARD, ANNEALED, NESTED)
LARGEST_ERROR = 0.1
TOO_FAR_APART = "its numbers are too far apart for double precision"  # whatever the engine
_BY_NAME = 20  # times as many evaluations where annealing was asked for
_CHILD = {ANNEALED: 1_000_001, NESTED: 1_000_002}  # no other child of a hypothesis' seed


def refuse_unknown(engine: str) -> None:
    """Refuse the name of an engine that there is not.

    Args:
        engine: the name given.

    Raises:
        InputError: naming those that there are.
    """
    if engine not in ENGINES:
        raise InputError(
            Problem(
                "Unknown engine",
                "engine",
                quoted(engine),
                f"one of: {', '.join(ENGINES)}",
                nearest(engine, ENGINES),
            )
        )


def answered(
    engine: str, model: Model, standard: Evidence, seed: np.random.SeedSequence
) -> tuple[Evidence, Drawn | None]:
    """Return the evidence by the engine asked for, or by annealing where the standard pair established none.

    Args:
        engine: one of ENGINES.
        model: the compiled hypothesis, with observed counts.
        standard: what the standard engine made of it.
        seed: the hypothesis' own.

    Returns:
        The evidence with every estimator's answer, the reported one last; and the draws that it was made
        from, None where the standard engine's answer stands.

    Raises:
        InputError: if nested sampling is asked for and dynesty is not installed.
    """
    is_final = standard.established or standard.reason == TOO_FAR_APART
    is_settled = engine == STANDARD or (engine == AUTO and is_final)
    if is_settled or model.observed is None or model.size == 0 or impossible_bins(model).any():
        return standard, None
    which = ANNEALED if engine == AUTO else engine
    own = np.random.SeedSequence(seed.entropy, spawn_key=(*seed.spawn_key, _CHILD[which]))
    if which == NESTED:
        drawn = sample_nested(model, model.observed, own)
    else:
        most = most_evaluations(model) * (1 if engine == AUTO else _BY_NAME)
        drawn = anneal(terrain_of(model, model.observed), own, most=most)
    why = _first_part(standard.reason) if engine == AUTO else ""
    return joined(standard, drawn, which, why), drawn


def joined(standard: Evidence, drawn: Drawn, engine: str, why: str) -> Evidence:
    """Return an evidence reported by another engine, beside what the standard one said.

    Args:
        standard: what the standard engine made of it.
        drawn: the other engine's answer.
        engine: its name.
        why: the reason for which it was called; empty where it was asked for by name.

    Returns:
        The evidence. It is established if the error is at most 0.1, the runs support each other, and it
        agrees with the standard answer where that is established, or with one of the two estimators where
        these are in order but differ.
    """
    if not np.isfinite([drawn.ln_evidence, drawn.error]).all():
        doubt = drawn.doubt or TOO_FAR_APART
        reason = f"{why}; and {doubt}" if why else doubt
        return replace(standard, established=False, reason=reason, engine=engine, engine_reason=why)
    estimate = Estimate(drawn.name, drawn.ln_evidence, drawn.error, None, drawn.evaluations)
    doubt = doubt_of(estimate, drawn.doubt, standard)
    return replace(
        standard,
        ln_evidence=drawn.ln_evidence,
        error=drawn.error,
        established=not doubt,
        reason=f"{why}; and {doubt}" if why and doubt else doubt,
        estimates=(*standard.estimates, estimate),
        engine=engine,
        engine_reason=why,
    )


def doubt_of(estimate: Estimate, doubt: str, standard: Evidence) -> str:
    """Return why an estimate of another engine is not established; empty when it is.

    Args:
        estimate: the estimate.
        doubt: what its own runs say.
        standard: what the standard engine made of the hypothesis.
    """
    if doubt:
        return doubt
    if estimate.error > LARGEST_ERROR:
        return f"the error of {estimate.name}, {estimate.error:.2g}, is above {LARGEST_ERROR}"
    if standard.reason.startswith(OTHER_MAXIMUM):
        return ""  # whatever the standard estimators say, it is without that
    if standard.established:
        others = standard.estimates[-1:]
    else:
        others = tuple(one for one in standard.estimates if is_in_order(one))
        if len(others) < 2 or agree(*others[-2:]):
            return ""  # none that has to be agreed with: the doubt was about what they have in common
    if any(agree(estimate, other) for other in others):
        return ""
    gaps = " and ".join(f"{one.name} by {abs(one.ln_evidence - estimate.ln_evidence):.2g}" for one in others)
    return f"{estimate.name} differs from {gaps}"


def is_in_order(estimate: Estimate) -> bool:
    """Tell whether an estimate's own error and k-hat are small enough."""
    allowed = largest_allowed(estimate.draws) if estimate.k_hat is not None else np.inf
    return estimate.error <= LARGEST_ERROR and (estimate.k_hat is None or estimate.k_hat < allowed)


def agree(first: Estimate, second: Estimate) -> bool:
    """Tell whether two estimates lie within 0.05 and three of their combined errors."""
    gap = abs(first.ln_evidence - second.ln_evidence)
    return gap <= largest_gap(first.error, second.error)


def _first_part(reason: str) -> str:
    """Return a reason without the advice that follows it."""
    return reason.split("; ", maxsplit=1)[0]
