"""Bins are checked once, copied and locked."""

from __future__ import annotations

import copy

import numpy as np
import pytest

from workbench.counts.binning import Binning
from workbench.errors import InputError


def refusal(low: object, high: object) -> list[str]:
    with pytest.raises(InputError) as caught:
        Binning(low, high)  # type: ignore[arg-type]
    return [problem.what for problem in caught.value.problems]


def test_edges_make_bins_without_gaps() -> None:
    binning = Binning.from_edges([0, 1, 3])
    assert (binning.number, binning.first, binning.last) == (2, 0.0, 3.0)
    assert binning.widths.tolist() == [1.0, 2.0]
    assert binning.centres.tolist() == [0.5, 2.0]


def test_gaps_between_bins_are_kept() -> None:
    binning = Binning(np.array([0.0, 5.0]), np.array([1.0, 6.0]))
    assert binning.low.tolist() == [0.0, 5.0]
    assert binning.high.tolist() == [1.0, 6.0]


def test_the_edges_are_copied_and_locked() -> None:
    low = np.array([0, 1], dtype=np.int64)
    binning = Binning(low, low + 1)  # type: ignore[arg-type]
    low[0] = -7
    assert binning.low.dtype == np.float64
    assert binning.low.tolist() == [0.0, 1.0]
    with pytest.raises(ValueError, match="read-only"):
        binning.low[0] = 3.0


def test_bins_can_be_sent_to_another_process() -> None:
    assert copy.deepcopy(Binning.from_edges([0, 1])).high.tolist() == [1.0]


def test_bins_that_overlap_or_run_backwards_are_refused() -> None:
    assert refusal([0, 1], [2, 3]) == ["Bins that overlap"]
    assert refusal([1, 0], [2, 1]) == ["Bins that are not sorted"]
    assert refusal([0], [0]) == ["Upper edges that are not above the lower ones"]


def test_touching_bins_are_no_overlap_even_where_decimals_are_not_exact() -> None:
    edges = np.arange(1, 12) * 0.1
    assert Binning.from_edges(edges).number == 10


def test_no_bins_and_lone_edges_are_refused() -> None:
    assert refusal([], []) == ["No bins"]
    assert refusal([0, 1], [1]) == ["Lower and upper edges that don't pair"]
    with pytest.raises(InputError, match="Fewer than two edges"):
        Binning.from_edges([4.0])


def test_what_is_no_list_of_finite_numbers_is_refused() -> None:
    assert refusal([0, np.nan], [1, np.inf]) == ["Numbers that are not finite"] * 2
    assert refusal([[0, 1]], [[1, 2]]) == ["A column that is no list of numbers"]
    assert refusal(["a"], [1]) == ["A column that is no list of numbers"]
    assert refusal([0j], [1]) == ["A column that is no list of numbers"]
    assert refusal([-1e200], [1e200]) == ["Numbers that are not finite"] * 2


def test_all_faults_are_told_at_once() -> None:
    assert refusal([0, 2, 1], [1, 2, 3]) == [
        "Upper edges that are not above the lower ones",
        "Bins that are not sorted",
    ]
