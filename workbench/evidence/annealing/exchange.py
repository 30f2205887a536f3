"""What may be exchanged or mirrored without changing the prior: signals for each other, a coordinate's sign.

In standard-normal coordinates every permutation and every change of sign keeps the prior, so that each is a
fair proposal whatever the likelihood; between mirror modes it is always taken.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import combinations

import numpy as np
import numpy.typing as npt

from workbench.errors import Caution, quoted
from workbench.hypotheses.processes import Process
from workbench.likelihood.model import Model

Array = npt.NDArray[np.float64]
Flags = npt.NDArray[np.bool_]
Indices = npt.NDArray[np.intp]

_FEW = 5
_PROBES = 4


@dataclass(frozen=True, slots=True, eq=False)
class Involutions:
    """Maps of the coordinates that are their own inverse and keep a standard-normal prior.

    Attributes:
        orders: (map, coordinate) which coordinate each one takes its value from.
        signs: (map, coordinate) 1 or -1.
    """

    orders: Indices
    signs: Array

    def applied(self, points: Array, uniform: Array) -> Array:
        """Return (..., coordinate) points after one map each, chosen by (...,) uniform numbers."""
        chosen = (uniform * len(self.orders)).astype(np.intp)
        return np.asarray(np.take_along_axis(points, self.orders[chosen], axis=-1) * self.signs[chosen])


def involutions(model: Model) -> Involutions:
    """Return the exchanges of like signals, as often as all mirrors together, and each coordinate's mirror.

    Args:
        model: a hypothesis with at least one coordinate.
    """
    same = np.arange(model.size)
    mirrors = 1.0 - 2.0 * np.eye(model.size)
    exchanges = [_exchanged(same, first, second) for first, second in like_signals(model)]
    if not exchanges:
        return Involutions(np.repeat(same[None], model.size, axis=0), mirrors)
    repeated = exchanges * max(1, model.size // len(exchanges))
    orders = np.concatenate([np.array(repeated), np.repeat(same[None], model.size, axis=0)])
    return Involutions(orders, np.concatenate([np.ones((len(repeated), model.size)), mirrors]))


def interchangeable(model: Model) -> list[tuple[str, str]]:
    """Return pairs of signal processes whose exchange leaves priors and expected events as they are."""
    if model.size == 0:
        return []
    points = np.random.default_rng(1).standard_normal((_PROBES, model.size))
    before = model.expected(model.seeds(points))[0]
    found = []
    for first, second in like_signals(model):
        priors = [[model.coordinates[index].prior for index in own] for own in (first, second)]
        order = _exchanged(np.arange(model.size), first, second)
        after = model.expected(model.seeds(points[:, order]))[0]
        if priors[0] == priors[1] and np.allclose(before, after, rtol=1e-9, atol=0.0):
            found.append((_owner(model, first), _owner(model, second)))
    return found


def like_signal_cautions(model: Model) -> list[Caution]:
    """Return a caution for each pair of signals that may stand for each other.

    Args:
        model: a hypothesis.
    """
    return [
        Caution(
            "like-signals",
            f"{quoted(model.hypothesis)}: {quoted(first)} and {quoted(second)} are alike, so that it means "
            "nothing which of two peaks belongs to which. The evidence is an average over both orders, as "
            "the priors are, and counts the exchange once.",
        )
        for first, second in interchangeable(model)
    ]


def _owner(model: Model, own: list[int]) -> str:
    return next(process.name for process in _signals(model) if _own(model, process) == own)


def _exchanged(same: Indices, first: list[int], second: list[int]) -> Indices:
    order = same.copy()
    order[first], order[second] = second, first
    return order


def like_signals(model: Model) -> list[tuple[list[int], list[int]]]:
    """Return pairs of signals that may stand for each other, as the coordinates that each has for its own.

    Two signal processes are alike when each has as many coordinates that no other process uses, of the same
    kinds in the same order; what is exchanged is a proposal only, so that alike need not mean the same.
    """
    own = [_own(model, process) for process in _signals(model)]
    kinds = [[model.coordinates[index].is_strength for index in each] for each in own]
    return [(own[a], own[b]) for a, b in combinations(range(len(own)), 2) if own[a] and kinds[a] == kinds[b]]


def blocks(model: Model) -> Flags:
    """Return (block, coordinate) flags of coordinates that may be moved together.

    Every signal's own coordinates, every shape coordinate of a signal alone; without any, every coordinate
    alone.
    """
    wholes = [own for own in (_own(model, process) for process in _signals(model)) if own]
    singles = [[int(index)] for index in model.signal if not model.coordinates[index].is_strength]
    found = [*wholes, *singles] or [[index] for index in range(model.size)]
    flags = np.zeros((len(found), model.size), dtype=bool)
    for row, block in enumerate(found):
        flags[row, block] = True
    return flags


def groups(model: Model) -> tuple[Indices, ...]:
    """Return coordinates that depend on each other in more than one way, so that they are drawn together.

    Each signal's own coordinates; all coordinates where they are few.
    """
    found = [own for own in (_own(model, process) for process in _signals(model)) if len(own) > 1]
    if 1 < model.size <= _FEW and list(range(model.size)) not in [sorted(own) for own in found]:
        found.append(list(range(model.size)))
    return tuple(np.array(own, dtype=np.intp) for own in found)


def _signals(model: Model) -> tuple[Process, ...]:
    return tuple(one for one in model.analysis.processes_of(model.hypothesis) if one.kind == "signal")


def _own(model: Model, process: Process) -> list[int]:
    """Return the coordinates that this process uses and no other one does."""
    others = {
        name
        for other in model.analysis.processes_of(model.hypothesis)
        if other.name != process.name
        for name in other.parameters
    }
    places = {coordinate.name: index for index, coordinate in enumerate(model.coordinates)}
    return [places[name] for name in process.parameters if name in places and name not in others]
