"""What each nuisance prior, raised to a power, does to its parameter and to the Bayes factor."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from workbench.evidence.integral.pareto import k_hat, largest_allowed
from workbench.evidence.integral.sampling import SCRAMBLES
from workbench.evidence.prior_choice.distance import cumulative_distance
from workbench.evidence.prior_choice.power import powered
from workbench.evidence.prior_choice.powers import Driver, PowerChange, PowerScaling
from workbench.evidence.weigh import Weighed, weigh_hypothesis
from workbench.hypotheses.priors import Prior
from workbench.likelihood.model import Model
from workbench.likelihood.objective import values_at_once

Array = npt.NDArray[np.float64]
Say = Callable[[str], None]

THRESHOLD = 0.05
CONFLICT = 2.0  # standard deviations
POWERS = (0.5, 2.0)
_STEP = 1.01
_LEAST_LEARNT = 0.05


@dataclass(frozen=True, slots=True, eq=False)
class Draws:
    """A hypothesis' weighted draws with what power-scaling asks of them.

    Attributes:
        weighed: the hypothesis, with grid and sample.
        seed: where fresh evidences take their random numbers from.
        weights: (draw,) posterior weights, the largest 1.
        ln_likelihood: (draw,) [nats], relative to the best draw.
    """

    weighed: Weighed
    seed: np.random.SeedSequence
    weights: Array
    ln_likelihood: Array

    @property
    def model(self) -> Model:
        """Return the compiled hypothesis."""
        return self.weighed.model


def draws_of(weighed: Weighed, seed: np.random.SeedSequence) -> Draws | None:
    """Return a hypothesis' draws; None where it has no usable sample.

    Args:
        weighed: the hypothesis.
        seed: where fresh evidences take their random numbers from.
    """
    sample, grid = weighed.sample, weighed.grid
    if sample is None or grid is None or not np.isfinite(sample.ln_evidence):
        return None
    model, counts = weighed.model, grid.integrand.counts
    rows = values_at_once(model)
    pieces = [sample.points[first : first + rows] for first in range(0, len(sample.points), rows)]
    with np.errstate(all="ignore"):
        found = np.concatenate([model.ln_likelihood(model.seeds(piece), counts) for piece in pieces])
    weights = np.exp(sample.ln_weights - sample.ln_weights.max())
    best = float(found[weights > 0.0].max())
    return Draws(weighed, seed, weights, np.where(weights > 0.0, found - best, 0.0))


def power_scaling(draws: Draws, against: Draws | None, say: Say = lambda _: None) -> tuple[PowerScaling, ...]:
    """Return the power-scaling of every nuisance prior of a hypothesis.

    A sensitivity is the distance of the marginal posterior from where it was, per doubling of the power, at
    power 1. Below 0.05 a posterior is taken not to depend on what was scaled. Where it depends on both, prior
    and likelihood pull at it: that is called a conflict from 2 standard deviations on, since two sources that
    lie one apart are what is expected.

    Args:
        draws: the hypothesis.
        against: the hypothesis it is compared with; None where that has no nuisance parameter.
        say: told how it goes on.

    Returns:
        One entry a nuisance parameter or source.

    Source:
        N. Kallioinen et al., Stat. Comput. 34 (2024) 57, sensitivities and threshold; from memory. The limit
        of 2 standard deviations: common practice, no source.
    """
    found = []
    for index in range(draws.model.size):
        if draws.model.coordinates[index].role != "signal":
            say(f"prior of {draws.model.coordinates[index].name} to a power")
            found.append(_scaled(draws, against, index))
    return tuple(found)


def _scaled(draws: Draws, against: Draws | None, index: int) -> PowerScaling:
    coordinate = draws.model.coordinates[index]
    values = _values(draws, index)
    by_prior, prior_error = _sensitivity(draws, values, lambda power: _ln_ratio(draws, index, power))
    by_data, data_error = _sensitivity(draws, values, lambda power: (power - 1.0) * draws.ln_likelihood)
    tension = _tension(draws, index)
    is_flat = powered(coordinate.prior, _STEP) is None
    return PowerScaling(
        coordinate.name,
        coordinate.role,
        coordinate.prior.text(),
        by_prior,
        prior_error,
        by_data,
        data_error,
        tension,
        Driver.FLAT if is_flat else driver(by_prior, by_data, tension),
        tuple(_change(draws, against, coordinate.name, power) for power in POWERS),
    )


def driver(by_prior: float, by_data: float, tension: float | None) -> Driver:
    """Return what a posterior rests on.

    Args:
        by_prior: sensitivity to the prior.
        by_data: sensitivity to the likelihood.
        tension: distance of prior and data [standard deviations].
    """
    if by_prior >= THRESHOLD and by_data >= THRESHOLD:
        return Driver.CONFLICT if tension is not None and abs(tension) >= CONFLICT else Driver.BOTH
    if by_prior >= THRESHOLD:
        return Driver.PRIOR
    return Driver.DATA if by_data >= THRESHOLD else Driver.BOTH


def _values(draws: Draws, index: int) -> Array:
    """Return (draw,) values of the parameter itself; a source's are its standard deviations."""
    sample = draws.weighed.sample
    points = sample.points[:, index] if sample is not None else np.zeros(0)
    coordinate = draws.model.coordinates[index]
    return points if coordinate.role == "source" else coordinate.prior.from_standard(points).value


def _ln_ratio(draws: Draws, index: int, power: float) -> Array | None:
    """Return (draw,) ln of the powered over the declared prior density; None where there is no such power."""
    prior = draws.model.coordinates[index].prior
    other = powered(prior, power)
    if other is None:
        return None
    values = _values(draws, index)
    ratio = other.ln_density(values) - prior.ln_density(values)
    return np.where(np.isnan(ratio), -np.inf, ratio)


def _sensitivity(
    draws: Draws, values: Array, ln_ratio: Callable[[float], Array | None]
) -> tuple[float, float]:
    """Return the sensitivity of a marginal posterior with its jackknife error over the scrambles."""
    factors = [ln_ratio(power) for power in (_STEP, 1.0 / _STEP)]
    known = [np.exp(factor) for factor in factors if factor is not None]
    if not known:
        return 0.0, 0.0

    def slope(kept: npt.NDArray[np.bool_]) -> float:
        before = draws.weights[kept]
        apart = [cumulative_distance(values[kept], before, before * factor[kept]) for factor in known]
        return float(np.mean(apart) / np.log2(_STEP))

    return _jackknife(slope, values.size)


def _jackknife(statistic: Callable[[npt.NDArray[np.bool_]], float], draws: int) -> tuple[float, float]:
    """Return a statistic of all draws, and its error from leaving out one scramble after the other."""
    scramble = np.arange(draws) // (draws // SCRAMBLES)
    whole = statistic(np.ones(draws, dtype=bool))
    without = np.array([statistic(scramble != one) for one in range(SCRAMBLES)])
    spread = (SCRAMBLES - 1.0) / SCRAMBLES * ((without - without.mean()) ** 2).sum()
    return whole, float(np.sqrt(spread))


def _tension(draws: Draws, index: int) -> float | None:
    """Return (mean - prior mean)/sqrt(prior variance - variance) in the standard coordinate.

    For normal prior and likelihood it is their distance over the root of the sum of their variances.
    """
    sample = draws.weighed.sample
    if sample is None:
        return None
    share = draws.weights / draws.weights.sum()
    t = sample.points[:, index]
    mean = float(share @ t)
    learnt = 1.0 - float(share @ (t - mean) ** 2)
    return mean / learnt**0.5 if learnt > _LEAST_LEARNT else None


def _change(draws: Draws, against: Draws | None, name: str, power: float) -> PowerChange:
    sides = [side for side in (draws, against) if side is not None and name in side.model.names]
    moves = [_move(side, name, power) for side in sides]
    if any(move.ln_change is None for move in moves):
        return PowerChange(power, None, None, None, any(move.is_fresh for move in moves))
    signed = [
        (move.ln_change or 0.0) * (1.0 if side is draws else -1.0)
        for side, move in zip(sides, moves, strict=True)
    ]
    error = float(np.hypot.reduce([move.error or 0.0 for move in moves]))
    shapes = [move.k_hat for move in moves if move.k_hat is not None]
    return PowerChange(
        power, sum(signed), error, max(shapes, default=None), any(move.is_fresh for move in moves)
    )


def _move(side: Draws, name: str, power: float) -> PowerChange:
    """Return how one hypothesis' ln evidence changes: by reweighting, or made again for uneven draws."""
    index = side.model.names.index(name)
    ln_ratio = _ln_ratio(side, index, power)
    sample = side.weighed.sample
    if ln_ratio is None or sample is None:
        is_flat = side.model.coordinates[index].prior.is_flat
        return PowerChange(power, 0.0 if is_flat else None, 0.0 if is_flat else None, None, False)
    shape = k_hat(sample.ln_weights + np.where(side.weights > 0.0, ln_ratio, 0.0))
    if shape >= largest_allowed(sample.ln_weights.size):
        return _made_again(side, index, power, shape)
    ratio = np.exp(ln_ratio)

    def moved(kept: npt.NDArray[np.bool_]) -> float:
        weights = side.weights[kept]
        return float(np.log((weights * ratio[kept]).sum() / weights.sum()))

    change, error = _jackknife(moved, side.weights.size)
    return PowerChange(power, change, error, shape, False)


def _made_again(side: Draws, index: int, power: float, shape: float) -> PowerChange:
    """Return the change from a fresh evidence under the powered prior."""
    model, before = side.model, side.weighed.evidence
    grid = side.weighed.grid
    other = powered(model.coordinates[index].prior, power)
    if other is None or grid is None or before.ln_evidence is None:
        return PowerChange(power, None, None, shape, True)
    changed = with_prior(model, index, other)
    after = weigh_hypothesis(changed, side.seed, closed_forms=False, near=grid.mode).evidence
    if after.ln_evidence is None or not after.established:
        return PowerChange(power, None, None, shape, True)
    error = float(np.hypot(before.error or 0.0, after.error or 0.0))
    return PowerChange(power, after.ln_evidence - before.ln_evidence, error, shape, True)


def with_prior(model: Model, index: int, prior: Prior) -> Model:
    """Return the model with another prior of one coordinate; a source then counts as a parameter with it.

    Args:
        model: a hypothesis.
        index: the coordinate's place.
        prior: its new prior.
    """
    coordinates = list(model.coordinates)
    coordinate = coordinates[index]
    role = "nuisance" if coordinate.role == "source" else coordinate.role
    coordinates[index] = replace(coordinate, role=role, prior=prior)
    return replace(model, coordinates=tuple(coordinates))
