"""What worker processes call in the tests."""

from __future__ import annotations

import os
import sys
import time

import numpy as np

from workbench.errors import InputError, Problem

PROBLEM = Problem("Empty region", "regions.peak", "no bins", "at least one", "add a bin")


def mean_of_normal(seed: np.random.SeedSequence, number: int) -> float:
    return float(np.random.default_rng(seed).normal(size=number).mean())


def busy(seconds: float) -> int:
    """Compute without a pause, as numpy would, and return the process."""
    end = time.monotonic() + seconds
    while time.monotonic() < end:
        np.linalg.svd(np.ones((40, 40)))
    return os.getpid()


def refuse() -> None:
    raise InputError(PROBLEM)


class Unpicklable(Exception):  # noqa: N818 -- stands for any library's
    def __init__(self, first: str, second: str) -> None:
        super().__init__(first + second)


def break_down() -> None:
    raise Unpicklable("two ", "arguments")


def talk() -> int:
    print("from afar")
    print("and a warning", file=sys.stderr)
    return 1


def die() -> None:
    os._exit(9)
