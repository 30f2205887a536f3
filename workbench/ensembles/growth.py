"""Counts that grow with exposure: at any exposure they hold those at every smaller one.

Exposure is laid out in blocks: up to 1, from 1 to 2, from 2 to 4, and on, each twice as long as all before.
The counts of a block are Poisson. Events of a Poisson process lie anywhere in their block alike, so that its
first half holds a binomial share of them, and each half is halved again, down to a part in 10^12. Every
half has its own random numbers: counts depend on seed and exposure only, not on the steps in between.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]
Counts = npt.NDArray[np.int64]

_HALVINGS = 40
_WHOLE = 1 << _HALVINGS
_MOST_EVENTS = 1e15  # the generator draws no larger counts


@dataclass(frozen=True, slots=True, eq=False)
class Growth:
    """A Poisson process in every bin.

    Attributes:
        rates: (bin,) expected events for an exposure of 1 [events]; >= 0.
        seed: where its events come from.
    """

    rates: Array
    seed: np.random.SeedSequence

    def counts(self, exposure: float) -> Array:
        """Return (bin,) counts up to an exposure [events].

        Args:
            exposure: >= 0, in units of what the rates stand for.

        Returns:
            Counts; those at a smaller exposure are among them. Expectations beyond 1e15 a block count as
            1e15.

        Source:
            Superposition and splitting of Poisson processes: J.F.C. Kingman, Poisson Processes (1993),
            chapters 2 and 5; from memory.
        """
        found = np.zeros(self.rates.size, dtype=np.int64)
        block, start, width = 0, 0.0, 1.0
        while start < exposure:
            part = min(round((exposure - start) / width * _WHOLE), _WHOLE)
            found += self._first(block, width, part)
            start += width
            width = start
            block += 1
        return found.astype(float)

    def _first(self, block: int, width: float, part: int) -> Counts:
        """Return the counts in the first `part` of 2^40 of a block."""
        expected = np.minimum(self.rates * width, _MOST_EVENTS)
        left = self._generator(block, 0, 0).poisson(expected).astype(np.int64)
        if part == _WHOLE:
            return left
        found, place = np.zeros_like(left), 0
        for level in range(_HALVINGS):
            bit = part >> (_HALVINGS - 1 - level) & 1
            if not left.any() or part & ((1 << (_HALVINGS - level)) - 1) == 0:
                break
            half = self._generator(block, level + 1, place).binomial(left, 0.5).astype(np.int64)
            if bit:
                found += half
                left = left - half
            else:
                left = half
            place = 2 * place + bit
        return found

    def _generator(self, block: int, level: int, place: int) -> np.random.Generator:
        key = (*self.seed.spawn_key, block, level, place)
        return np.random.default_rng(np.random.SeedSequence(self.seed.entropy, spawn_key=key))
