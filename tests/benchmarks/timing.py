"""Timing on machines that are never quiet: what is measured, and a unit of work, in turns in the same run.

Times are processor times, and limits are ratios of fastest rounds, since a busy neighbour slows both sides of
a ratio. The times that were
wanted, in milliseconds on the machine where the limits were set, are only reported.
"""

from __future__ import annotations

import time
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
import pytest
from pytest_benchmark.fixture import BenchmarkFixture

UNIT = "1,024 x 60 exponentials and logarithms, one matrix product, and 100 operations on small arrays"

_POINTS = np.random.default_rng(1).standard_normal((1024, 11))
_MIXING = 0.1 * np.random.default_rng(2).standard_normal((11, 60))
_SMALL = np.random.default_rng(4).standard_normal((15, 11))
_COUNTS = np.random.default_rng(3).poisson(20.0, 60).astype(float)


def unit_of_work() -> float:
    """Do what any evaluation of 1,024 points of 60 bins has to do; none of this project's code takes part."""
    events = np.exp(3.0 + _POINTS @ _MIXING)
    small = _SMALL
    for _ in range(50):  # what numpy asks for each call, however little there is to do
        small = small * 0.5 + _SMALL
    return float((_COUNTS * np.log(events) - events).sum() + small[0, 0])


@dataclass(frozen=True, slots=True)
class Race:
    """Fastest and middle round of what was measured and of the unit, taken in turns.

    Attributes:
        name: what was measured.
        fastest, middle: its rounds [s].
        unit: fastest round of the unit of work [s].
    """

    name: str
    fastest: float
    middle: float
    unit: float

    @property
    def units(self) -> float:
        """Return how many units of work it takes."""
        return self.fastest / self.unit

    def text(self, wanted: float | None = None) -> str:
        """Return a line for the terminal, with the time that was wanted [s] and whether it was reached."""
        line = (
            f"{self.name}: fastest {1e3 * self.fastest:.1f} ms, middle {1e3 * self.middle:.1f} ms, "
            f"{self.units:.0f} units of work of {1e3 * self.unit:.2f} ms"
        )
        if wanted is None:
            return line
        verdict = "reached" if self.fastest <= wanted else "NOT reached in this run"
        return f"{line}; wanted {1e3 * wanted:.0f} ms: {verdict}"


def race(benchmark: BenchmarkFixture, name: str, work: Callable[[], Any], rounds: int = 15) -> Race:
    """Measure some work and the unit in turns.

    Args:
        benchmark: pytest-benchmark's fixture, which keeps the rounds for its own table.
        name: what is measured.
        work: what is measured; called once more than rounds, the first call not timed.
        rounds: how often.
    """
    work()
    unit_of_work()
    units: list[float] = []
    rounds_taken: list[float] = []

    def unit() -> None:
        units.extend(timed(unit_of_work) for _ in range(5))

    in_turns(benchmark, lambda: rounds_taken.append(timed(work)), unit, rounds)
    found = Race(name, min(rounds_taken), float(np.median(rounds_taken)), min(units))
    benchmark.extra_info["units of work"] = round(found.units, 1)
    return found


def in_turns(
    benchmark: BenchmarkFixture, work: Callable[[], Any], other: Callable[[], Any], rounds: int
) -> None:
    """Run something else and the work in turns; pytest-benchmark keeps the rounds of the work.

    Args:
        benchmark: pytest-benchmark's fixture.
        work: what is measured.
        other: what runs before each round.
        rounds: how often.
    """
    benchmark.pedantic(work, setup=other, rounds=rounds)  # type: ignore[no-untyped-call]


def timed(work: Callable[[], Any]) -> float:
    """Return the processor time that a call takes [s]: on a quiet machine the time by the clock."""
    start = time.process_time()
    work()
    return time.process_time() - start


def timed_by_clock(work: Callable[[], Any]) -> float:
    """Return how long a call takes by the clock [s], what it starts and waits for included."""
    start = time.perf_counter()
    work()
    return time.perf_counter() - start


def report(capsys: pytest.CaptureFixture[str], *lines: str) -> None:
    """Print past pytest's capture, so that a run shows its numbers without further options."""
    with capsys.disabled():
        print("\n  " + "\n  ".join(lines), end="", flush=True)
