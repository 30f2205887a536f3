"""Counts are counts, templates have a number for every bin, errors belong to a template."""

from __future__ import annotations

import copy
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from workbench.counts.binning import Binning
from workbench.counts.table import Table
from workbench.errors import InputError

BINNING = Binning.from_edges([0, 1, 2, 3])


def refusal(observed: Any, columns: Any = None, errors: Any = None) -> list[str]:
    with pytest.raises(InputError) as caught:
        Table(BINNING, observed, columns or {}, errors or {})
    return [problem.what for problem in caught.value.problems]


def test_arrays_are_copied_and_locked() -> None:
    fakes = np.array([1.0, 2.0, 3.0])
    table = Table(BINNING, np.array([4, 5, 6]), {"fakes": fakes})
    fakes[0] = 99.0
    assert table.columns["fakes"].tolist() == [1.0, 2.0, 3.0]
    assert table.observed is not None
    assert table.observed.dtype == np.float64
    for values in (table.observed, table.columns["fakes"]):
        with pytest.raises(ValueError, match="read-only"):
            values[0] = 1.0


def test_a_table_without_counts_is_for_planning() -> None:
    assert Table(BINNING, None).observed is None


@given(st.integers(0, 2**53 - 1))
def test_every_count_that_is_taken_is_kept_to_the_last_event(count: int) -> None:
    observed = Table(BINNING, np.array([count, 0, 10**15])).observed
    assert observed is not None
    assert [int(value) for value in observed] == [count, 0, 10**15]


def test_what_is_no_count_is_refused() -> None:
    assert refusal([1, -1, 0]) == ["Observed counts below zero"]
    assert refusal([1, 0.5, 0]) == ["Observed counts that are not whole numbers"]
    assert refusal([1, 2.0**53, 0]) == ["Observed counts too large to be kept exactly"]
    assert refusal([1, np.nan, 0]) == ["Numbers that are not finite"]


def test_bins_are_counted_from_one_where_there_is_no_file() -> None:
    with pytest.raises(InputError, match='Python, bins 1 and 3, column "observed"'):
        Table(BINNING, [-1, 2, -4])  # type: ignore[arg-type]


def test_all_faults_are_told_at_once() -> None:
    found = refusal(
        [1, -1, 0.5], {"fakes": [1, 2], "low": [1, 2, 3]}, {"fakes": [0, -1, 0], "rare": [0, 0, 0]}
    )
    assert found == [
        "A column of another length than the bins",
        "Observed counts below zero",
        "Observed counts that are not whole numbers",
        "Errors below zero",
        "A template with a name that means something else",
        "Errors of a template that is not there",
    ]


def test_the_digest_names_the_numbers_and_nothing_else() -> None:
    first = Table(BINNING, None, {"a": np.ones(3), "b": np.zeros(3)})
    again = Table(BINNING, None, {"b": np.zeros(3), "a": np.ones(3)}, source="elsewhere")
    other = Table(BINNING, None, {"a": np.ones(3), "b": np.array([0.0, 0.0, 1e-300])})
    assert first.digest == again.digest != other.digest
    assert first.digest.startswith("sha256:")


def test_a_table_can_be_sent_to_another_process() -> None:
    table = copy.deepcopy(Table(BINNING, None, {"a": np.ones(3)}, {"a": np.ones(3)}))
    assert table.columns["a"].tolist() == table.errors["a"].tolist() == [1.0, 1.0, 1.0]
