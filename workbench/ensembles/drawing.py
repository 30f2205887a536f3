"""Drawing pseudo-experiments: parameters, then counts from a hypothesis' law."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
import numpy.typing as npt

from workbench.likelihood.laws import noisy_bins
from workbench.likelihood.model import Model

Array = npt.NDArray[np.float64]

BLOCK = 100
_MOST_EVENTS = 1e15  # the generator draws no larger counts; an uncertainty of a factor of 1e99 asks for them
_SMALLEST_SHAPE = 1e-300


def pseudo_experiments(
    model: Model, seed: np.random.SeedSequence, number: int, *, first: int = 0, held: Array | None = None
) -> Iterator[Array]:
    """Yield the counts of pseudo-experiments, a block at a time.

    Each block has its own child of the seed and is always drawn whole: a pseudo-experiment is the same
    whoever draws it, in whatever order, and however many are asked for.

    Args:
        model: a hypothesis.
        seed: the ensemble's seed.
        number: how many pseudo-experiments.
        first: number of pseudo-experiments drawn before.
        held: (coordinate,) parameter values to hold; nan where the prior is drawn from; None draws all.

    Yields:
        (row, bin) counts [events]; rows of all blocks together are `number`.
    """
    stop = first + number
    for block in range(first // BLOCK, -(-stop // BLOCK)):
        child = np.random.SeedSequence(seed.entropy, spawn_key=(*seed.spawn_key, block))
        generator = np.random.default_rng(child)
        counts = draw_counts(model, draw_parameters(model, generator, BLOCK, held), generator)
        start = block * BLOCK
        yield counts[max(first - start, 0) : min(stop - start, BLOCK)]


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
        noisy = noisy_bins(expected, variance)
        shape = np.where(noisy, expected**2 / np.where(noisy, variance, 1.0), 1.0)
        shape = np.clip(np.nan_to_num(shape), _SMALLEST_SHAPE, 1.0 / _SMALLEST_SHAPE)
        expected = np.where(noisy, generator.gamma(shape) / shape, 1.0) * expected
    return generator.poisson(np.clip(np.nan_to_num(expected), 0.0, _MOST_EVENTS)).astype(float)
