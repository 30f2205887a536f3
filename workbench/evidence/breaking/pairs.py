"""Pairs of evidences under a distortion, made by the engine: the ground that the search stands on."""

from __future__ import annotations

from dataclasses import replace
from functools import cache

import numpy as np
import numpy.typing as npt

from workbench.evidence.breaking.question import Question
from workbench.evidence.breaking.trials import Anchor, draws_of
from workbench.evidence.exact import linear_rates
from workbench.evidence.integral.quadrature import integrate
from workbench.evidence.weigh import Weighed, weigh_hypothesis
from workbench.likelihood.distortions import held_distortion, nominal_background
from workbench.likelihood.model import Model

Array = npt.NDArray[np.float64]

_STEP = 2.0  # of a difference, in the counts' statistical uncertainty


def pair_at(question: Question, coefficients: Array, near: Anchor, again: int = 0) -> Anchor:
    """Return the pair of evidences under a distortion.

    Args:
        question: what is asked.
        coefficients: (term,) the distortion.
        near: another pair, whose modes are good places to start from.
        again: each number has random numbers of its own.

    Returns:
        The pair, with draws where both evidences are established.
    """
    factors = question.factors(coefficients)
    made = []
    for model, seed, before in zip(question.models, question.seeds, near.pair, strict=True):
        key = (*seed.spawn_key, again) if again else seed.spawn_key
        child = np.random.SeedSequence(seed.entropy, spawn_key=key)
        made.append(_weighed(held_distortion(model, factors), child, before))
    return _anchor(question, coefficients, (made[0], made[1]))


def declared_pair(question: Question) -> Anchor:
    """Return the pair of evidences without a distortion, as `weigh` makes them."""
    signal, against = question.models
    first = _weighed(against, question.seeds[1])
    second = _weighed(signal, question.seeds[0], first)
    return _anchor(question, np.zeros(len(question.functions)), (second, first))


def _weighed(model: Model, seed: np.random.SeedSequence, before: Weighed | None = None) -> Weighed:
    """Return a hypothesis' evidence with draws, the evidence itself in closed form where that holds."""
    near = before.grid.mode if before is not None and before.grid is not None else {}
    drawn = weigh_hypothesis(model, seed, closed_forms=False, near=near)
    if model.size == 0 or linear_rates(model) is None:
        return drawn
    return replace(drawn, evidence=weigh_hypothesis(model, seed, near=near).evidence)


def _anchor(question: Question, coefficients: Array, pair: tuple[Weighed, Weighed]) -> Anchor:
    functions, bins = question.functions, question.bins
    if not all(one.evidence.established and (one.sample or not one.model.size) for one in pair):
        return Anchor(coefficients, functions, pair, (), lambda: np.zeros(len(functions)))
    factors = np.exp(coefficients @ functions)
    draws = tuple(
        draws_of(one, model, bins, factors) for one, model in zip(pair, question.models, strict=True)
    )
    return Anchor(coefficients, functions, pair, draws, cache(lambda: _tilt(question, coefficients, pair)))


def _tilt(question: Question, coefficients: Array, pair: tuple[Weighed, Weighed]) -> Array:
    """Return (term,) derivatives of ln B as central differences of quadratures, which have no noise.

    The step is some of the counts' own statistical uncertainty: ln B bends over no shorter distance.
    """
    events = float(nominal_background(question.models[1])[question.bins].sum())
    step = float(np.clip(_STEP / np.sqrt(events), 1e-3, 0.03))
    found = []
    for way in np.eye(len(coefficients)):
        up, down = (_by_quadrature(question, coefficients + sign * step * way, pair) for sign in (1.0, -1.0))
        found.append((up - down) / (2.0 * step))
    return np.asarray(np.nan_to_num(np.array(found)))


def _by_quadrature(question: Question, coefficients: Array, near: tuple[Weighed, Weighed]) -> float:
    """Return ln B by quadrature alone; nan where there is none."""
    factors = question.factors(coefficients)
    values = []
    for model, before in zip(question.models, near, strict=True):
        moved, counts = held_distortion(model, factors), model.observed_for("a break point")
        if model.size == 0:
            values.append(float(moved.ln_likelihood(moved.seeds(np.zeros((1, 0))), counts)[0]))
            continue
        grid = integrate(moved, counts, before.grid.mode if before.grid is not None else {})
        values.append(np.nan if grid is None else grid.ln_evidence)
    return values[0] - values[1]
