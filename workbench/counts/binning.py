"""The bins of one region: ascending, not overlapping, gaps allowed."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Self

import numpy as np
import numpy.typing as npt

from workbench.counts.magnitudes import LARGEST
from workbench.counts.places import Places, number_text
from workbench.errors import InputError, Problem

Array = npt.NDArray[np.float64]

FINITE = "finite numbers, at most 1e100 in size"


@dataclass(frozen=True, slots=True, eq=False)
class Binning:
    """Lower and upper edges of every bin; any arrays of numbers are taken, copied and locked.

    Attributes:
        low: (bin,) lower edges, ascending.
        high: (bin,) upper edges; each above its lower edge and at most the next bin's lower edge.

    Raises:
        InputError: with everything that is wrong with the edges.
    """

    low: Array
    high: Array

    def __post_init__(self) -> None:
        places = Places("binning")
        low, high = locked(self.low, "low", places), locked(self.high, "high", places)
        problems = edge_problems(low, high, places)
        if problems:
            raise InputError(*problems)
        object.__setattr__(self, "low", low)
        object.__setattr__(self, "high", high)

    @classmethod
    def from_edges(cls, edges: npt.ArrayLike) -> Self:
        """Return the bins between consecutive edges.

        Args:
            edges: (bin + 1,) edges, ascending.

        Returns:
            The bins, without gaps.

        Raises:
            InputError: if there are fewer than two edges, or they don't ascend.
        """
        values = locked(edges, "edges", Places("binning"))
        if values.size < 2:
            raise InputError(
                Problem(
                    "Fewer than two edges",
                    Places("binning").column("edges"),
                    f"{values.size}",
                    "at least two: one bin has two edges",
                    "give the edges of all bins, the last bin's upper one included",
                )
            )
        return cls(values[:-1], values[1:])

    @property
    def number(self) -> int:
        """Return the number of bins."""
        return int(self.low.size)

    @property
    def first(self) -> float:
        """Return the first edge of the range."""
        return float(self.low[0])

    @property
    def last(self) -> float:
        """Return the last edge of the range."""
        return float(self.high[-1])

    @property
    def widths(self) -> Array:
        """Return the (bin,) widths."""
        return self.high - self.low

    @property
    def centres(self) -> Array:
        """Return the (bin,) midpoints."""
        return 0.5 * self.low + 0.5 * self.high


def locked(values: npt.ArrayLike, column: str, places: Places) -> Array:
    """Return a one-dimensional copy in double precision that can't be written to.

    Args:
        values: (bin,) numbers, in anything that numpy makes an array of.
        column: what they are, for the message.
        places: where they stand.

    Returns:
        (bin,) the copy.

    Raises:
        InputError: if they are no real numbers or not one-dimensional.
    """
    try:
        given = np.asarray(values)
        copy = None if np.iscomplexobj(given) else np.array(given, dtype=np.float64)
    except (TypeError, ValueError, OverflowError):
        copy = None
    if copy is None or copy.ndim != 1:
        raise InputError(
            Problem(
                "A column that is no list of numbers",
                places.column(column),
                "something else" if copy is None else f"an array with {copy.ndim} axes",
                "one number a bin",
                "give a list or a one-dimensional array of real numbers",
            )
        )
    copy.setflags(write=False)
    return copy


def not_finite_problem(values: Array, column: str, places: Places) -> Problem | None:
    """Return what to say about nan, infinite and overlarge numbers in a column, if there are any."""
    rows = np.flatnonzero(~(np.abs(values) <= LARGEST))
    if not rows.size:
        return None
    return Problem(
        "Numbers that are not finite",
        places.where(rows, column),
        places.found(rows, column, values),
        FINITE,
        "find out what made them; an empty bin is written 0",
    )


def edge_problems(low: Array, high: Array, places: Places) -> list[Problem]:
    """Return everything that is wrong with the edges of bins."""
    if low.size != high.size or not low.size:
        return [
            Problem(
                "No bins" if low.size == high.size else "Lower and upper edges that don't pair",
                places.source,
                f"{low.size} lower and {high.size} upper edges",
                "as many lower edges as upper ones, at least one",
                "give both edges of every bin",
            )
        ]
    not_finite = [not_finite_problem(low, "low", places), not_finite_problem(high, "high", places)]
    return [problem for problem in not_finite if problem] + order_problems(low, high, places)


def order_problems(low: Array, high: Array, places: Places) -> list[Problem]:
    """Return what is wrong with the order of edges, bins with a nan left aside."""
    problems = []
    empty = np.flatnonzero(high <= low)
    if empty.size:
        upper, lower = places.found(empty, "high", high), places.found(empty, "low", low)
        problems.append(
            Problem(
                "Upper edges that are not above the lower ones",
                places.where(empty, "high"),
                f"{upper}, with the lower edge at {lower}",
                "more than the lower edge",
                "swap the two edges, or mend the wrong one",
            )
        )
    out_of_place = np.flatnonzero((low[1:] < low[:-1]) | (low[1:] < high[:-1]))
    if out_of_place.size:  # only the first: one bin out of place makes its neighbours look wrong too
        problems.append(_out_of_place(int(out_of_place[0]) + 1, low, high, places))
    return problems


def _out_of_place(later: int, low: Array, high: Array, places: Places) -> Problem:
    before, start = places.row(later - 1), places.found(later, "low", low)
    if low[later] < low[later - 1]:
        return Problem(
            "Bins that are not sorted",
            places.where(later, "low"),
            f"{start}, after {places.found(later - 1, 'low', low)} in {before}",
            "lower edges that ascend",
            "sort the bins by their lower edge",
        )
    return Problem(
        "Bins that overlap",
        places.where(later, "low"),
        f"{start}, while {before} reaches up to {places.found(later - 1, 'high', high)}",
        f"at least {number_text(high[later - 1])}",
        "give each event one bin: bins may touch or leave gaps",
    )
