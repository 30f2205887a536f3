"""What a toy experiment is made from: a hypothesis with a value for everything it does not know."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np

from workbench.errors import InputError, Problem, nearest, quoted
from workbench.hypotheses.alternatives import Variant, variants_of
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.faults import dotted
from workbench.hypotheses.frozen import FrozenMapping
from workbench.likelihood.model import Model, compile_model

_STREAM = 6  # of the seed, this file's own
_VALUES, _ALTERNATIVE = 0, 1


@dataclass(frozen=True, slots=True)
class Truth:
    """What pseudo-data were made from.

    Attributes:
        hypothesis: the true one.
        alternative: the true alternative of the backgrounds; empty where there is no doubt.
        values: every parameter's and every source's true value, a source's in standard deviations.
        drawn: the names of those that were drawn from their priors.
        units: parameter to unit.
        seed: where the draws come from.
    """

    hypothesis: str
    alternative: str
    values: Mapping[str, float]
    drawn: tuple[str, ...]
    units: Mapping[str, str]
    seed: int


def true_model(
    analysis: Analysis,
    hypothesis: str | None,
    true: Mapping[str, float],
    alternative: str | None,
    seed: int,
) -> tuple[Model, Truth]:
    """Return the true hypothesis with the parameters that are set held there, and every true value.

    Args:
        analysis: the scenario.
        hypothesis: the true one; None for the last.
        true: true values by name of a parameter or a source; of those that another alternative uses, nothing
            is needed.
        alternative: which alternative of the backgrounds is true; None draws one.
        seed: where the draws come from.

    Returns:
        The compiled hypothesis, and the truth.

    Raises:
        InputError: if there is no such hypothesis, parameter, source or alternative, or a true value makes an
            expected count negative.
    """
    name = analysis.hypotheses[-1].name if hypothesis is None else analysis.hypothesis(hypothesis).name
    variant = _variant(variants_of(analysis, name), name, alternative, seed)
    _refuse_strangers(analysis, name, true)
    used = {one for process in variant.analysis.processes_of(name) for one in process.parameters}
    held = {one: float(value) for one, value in true.items() if one in used}
    model = compile_model(_holding(variant.analysis, name, held), name)
    drawn = _drawn(analysis, model, seed)
    values = {**model.analysis.held_parameters(name), **drawn}
    values |= {one: float(value) for one, value in true.items() if one in values}
    return model, Truth(
        name,
        variant.name,
        FrozenMapping(values),
        tuple(one for one in drawn if one not in true),
        FrozenMapping({one.name: one.unit for one in analysis.parameters if one.name in values}),
        seed,
    )


def _drawn(analysis: Analysis, model: Model, seed: int) -> dict[str, float]:
    """Return a value of each free coordinate from its prior, the same whatever else is free."""
    names = dict.fromkeys(parameter.name for parameter in analysis.parameters)
    names |= dict.fromkeys(model.analysis.sources_used(model.hypothesis))
    stream = np.random.SeedSequence(seed, spawn_key=(_STREAM, _VALUES))
    standard = np.random.default_rng(stream).standard_normal(len(names))
    by_name = dict(zip(names, standard, strict=True))
    point = np.array([[by_name[name] for name in model.names]])
    return dict(zip(model.names, model.seeds(point).x[:, 0].tolist(), strict=True))


def _variant(variants: tuple[Variant, ...], hypothesis: str, name: str | None, seed: int) -> Variant:
    """Return the true combination of alternatives: the one named, or one drawn."""
    if name is None:
        stream = np.random.SeedSequence(seed, spawn_key=(_STREAM, _ALTERNATIVE))
        place = np.random.default_rng(stream).choice(len(variants), p=[one.prior for one in variants])
        return variants[int(place)]
    for one in variants:
        if one.name == name:
            return one
    known = [one.name for one in variants if one.name]
    raise InputError(
        Problem(
            "No alternative of this name",
            f"true alternative of {quoted(hypothesis)}",
            quoted(name),
            "one of " + ", ".join(quoted(one) for one in known) if known else "none: nothing is in doubt",
            nearest(name, known) if known else "leave it out",
        )
    )


def _refuse_strangers(analysis: Analysis, hypothesis: str, true: Mapping[str, float]) -> None:
    used = {name for process in analysis.processes_of(hypothesis) for name in process.parameters}
    known = [*sorted(used), *analysis.sources_used(hypothesis)]
    problems = []
    for name, value in true.items():
        where = f"true value of {quoted(name)}"
        if name not in known:
            expected = f"a parameter or a source that {quoted(hypothesis)} uses"
            problems.append(
                Problem("A true value of nothing known", where, quoted(name), expected, nearest(name, known))
            )
        elif not math.isfinite(value):
            problems.append(
                Problem(
                    "A true value that is no number", where, str(value), "a finite number", "give a number"
                )
            )
    if problems:
        raise InputError(*problems)


def _holding(analysis: Analysis, hypothesis: str, held: Mapping[str, float]) -> Analysis:
    """Return the analysis with parameters of a hypothesis held at their true values."""
    hypotheses = tuple(
        replace(one, fix={**one.fix, **held}) if one.name == hypothesis else one
        for one in analysis.hypotheses
    )
    try:
        return replace(analysis, hypotheses=hypotheses)
    except InputError as error:
        told = dotted(("hypotheses", hypothesis, "fix")) + "."
        raise InputError(
            *(
                replace(problem, where=problem.where.replace(told, "true value of "))
                for problem in error.problems
            )
        ) from None
