"""Drawing pseudo-experiments: parameters, then counts from a hypothesis' law."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from workbench.likelihood.model import Model

Array = npt.NDArray[np.float64]

_BLOCK = 100
# The generator draws no larger counts; an uncertainty of a factor of 1e99 asks for them.
_MOST_EVENTS = 1e15


def blocks(
    seed: np.random.SeedSequence, number: int, first: int = 0
) -> list[tuple[np.random.Generator, int]]:
    """Return generators for blocks of pseudo-experiments, one child of the seed a block.

    The same pseudo-experiment always comes from the same child, whoever draws it and in whatever order.

    Args:
        seed: the ensemble's seed.
        number: how many pseudo-experiments.
        first: number of pseudo-experiments drawn before; a multiple of the block's size.

    Returns:
        A generator and a number of pseudo-experiments for each block.
    """
    found = []
    for start in range(first, first + number, _BLOCK):
        child = np.random.SeedSequence(seed.entropy, spawn_key=(*seed.spawn_key, start // _BLOCK))
        found.append((np.random.default_rng(child), min(_BLOCK, first + number - start)))
    return found


def draw_parameters(
    model: Model, generator: np.random.Generator, number: int, held: Array | None = None
) -> Array:
    """Return parameter values drawn from their priors, or held where a number is given.

    Args:
        model: a hypothesis.
        generator: where the random numbers come from.
        number: how many draws.
        held: (coordinate,) values to hold; nan where the prior is drawn from; None draws all.

    Returns:
        (draw, coordinate) parameter values.
    """
    standard = generator.standard_normal((number, model.size))
    values = model.seeds(standard).x.T
    return values if held is None else np.where(np.isnan(held), values, held)


def draw_counts(model: Model, values: Array, generator: np.random.Generator) -> Array:
    """Return counts drawn from a hypothesis at parameter values.

    With template errors a bin's expectation is first multiplied by a gamma-distributed factor of mean 1 and
    variance V/T^2.

    Args:
        model: a hypothesis.
        values: (draw, coordinate) parameter values.
        generator: where the random numbers come from.

    Returns:
        (draw, bin) counts [events]; expectations beyond 1e15 count as 1e15.
    """
    expected, variance = model.expected(model.natural_seeds(values))
    expected = np.clip(np.nan_to_num(expected), 0.0, _MOST_EVENTS)
    if variance is not None:
        noisy = (variance > 0.0) & (expected > 0.0)
        shape = np.where(noisy, expected**2 / np.where(noisy, variance, 1.0), 1.0)
        factor = generator.gamma(shape) / shape
        expected = np.minimum(np.where(noisy, expected * factor, expected), _MOST_EVENTS)
    return generator.poisson(expected).astype(float)
