"""Words on pictures: shortened, set, and moved apart."""

from __future__ import annotations

import itertools

import pytest
from hypothesis import given
from hypothesis import strategies as st

from workbench.plots.words import shortened, spread, typeset, wrapped


def test_powers_are_raised() -> None:
    assert typeset("(1.07 ± 0.11) × 10^−14 in fb^-1") == "(1.07 ± 0.11) × 10$^{-14}$ in fb$^{-1}$"


def test_a_long_name_is_shortened_and_holds_no_mathematics() -> None:
    assert shortened("a" * 40) == "a" * 31 + "…"
    assert shortened("costs $5") == r"costs \$5"
    assert wrapped("signal plus background") == "signal plus\nbackground"


def test_positions_that_fit_are_left_alone() -> None:
    assert spread([0.2, 0.8, 0.5], [0.1, 0.1, 0.1], 0.0, 1.0) == [0.2, 0.8, 0.5]


def test_equal_positions_keep_their_order() -> None:
    assert spread([0.5, 0.5], [0.2, 0.2], 0.0, 1.0) == pytest.approx([0.5, 0.7])


@given(st.lists(st.floats(-1.0, 2.0), min_size=1, max_size=8))
def test_things_that_have_room_never_overlap_nor_leave_it(wanted: list[float]) -> None:
    size = 0.12
    centres = spread(wanted, [size] * len(wanted), 0.0, 1.0)
    ordered = sorted(centres)
    assert ordered[0] >= 0.5 * size - 1e-9
    assert ordered[-1] <= 1.0 - 0.5 * size + 1e-9
    assert all(after - before >= size - 1e-9 for before, after in itertools.pairwise(ordered))
