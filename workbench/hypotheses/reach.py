"""Which values a parameter, or a product of parameters, can take.

A parameter reaches over its prior's support and over the numbers that hypotheses hold it at.
"""

from __future__ import annotations

import math
from collections import Counter
from collections.abc import Iterator, Mapping
from dataclasses import dataclass

from workbench.hypotheses.declared import Declared
from workbench.hypotheses.priors import Fixed, Prior
from workbench.hypotheses.quantities import Curve, Quantity

Range = tuple[float, float]


@dataclass(frozen=True, slots=True)
class Reach:
    """The values that a parameter can take.

    Attributes:
        prior: its prior.
        held: hypothesis to the number that it holds the parameter at.
    """

    prior: Prior
    held: Mapping[str, float]

    @property
    def range(self) -> Range:
        """Return the smallest and the largest value."""
        low, high = self.prior.support
        return (min((low, *self.held.values())), max((high, *self.held.values())))

    @property
    def is_exact(self) -> bool:
        """Tell whether the prior is one number."""
        return isinstance(self.prior, Fixed)


def reaches_of(declared: Declared) -> dict[str, Reach]:
    """Return the reach of every parameter that could be read."""
    held: dict[str, dict[str, float]] = {}
    for hypothesis in declared.hypotheses.values():
        for name, number in hypothesis.fix.items() if hypothesis is not None else ():
            held.setdefault(name, {})[hypothesis.name if hypothesis is not None else ""] = number
    return {
        name: Reach(parameter.prior, held.get(name, {}))
        for name, parameter in declared.parameters.items()
        if parameter is not None
    }


def atoms(quantity: Quantity) -> Iterator[float | str | Curve]:
    """Yield the numbers, names and curves that a quantity multiplies."""
    if isinstance(quantity, tuple):
        yield from quantity
    else:
        yield quantity


def product_range(factors: tuple[float | str | Curve, ...], reaches: Mapping[str, Reach]) -> Range | None:
    """Return the smallest and largest value of a product; None where a parameter is not known.

    A parameter that occurs twice is squared, and a square is never negative.

    Args:
        factors: numbers, names and curves.
        reaches: name to reach.

    Returns:
        The range, perhaps infinite, or None.

    Source:
        none, definition: interval arithmetic.
    """
    total: Range = (1.0, 1.0)
    for name, times in Counter(one for one in factors if isinstance(one, str)).items():
        if name not in reaches:
            return None
        total = _times(total, _power(reaches[name].range, times))
    for one in factors:
        if isinstance(one, Curve):
            if not one.values:
                return None
            total = _times(total, (min(one.values), max(one.values)))
        elif not isinstance(one, str):
            total = _times(total, (one, one))
    return total


def _times(left: Range, right: Range) -> Range:
    ends = [0.0 if 0.0 in (a, b) else a * b for a in left for b in right]
    return (min(ends), max(ends))


def _power(ends: Range, times: int) -> Range:
    low, high = (math.copysign(1.0, end) ** times * _size(abs(end), times) for end in ends)
    if times % 2:
        return (low, high)
    return (0.0 if ends[0] <= 0.0 <= ends[1] else min(low, high), max(low, high))


def _size(size: float, times: int) -> float:
    try:
        return size**times
    except OverflowError:
        return math.inf
