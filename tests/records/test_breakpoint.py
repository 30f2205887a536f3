"""Screens and record of `breakpoint`, from break points built by hand."""

from __future__ import annotations

import json
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from tests.records import broken
from workbench.evidence.breaking.results import BreakPoint
from workbench.records.breakpoint_record import breakpoint_record
from workbench.records.files import read_record, record_text, write_record
from workbench.records.screens.breakpoint import breakpoint_screen
from workbench.records.screens.layout import WIDEST

EXPECTED = Path(__file__).parents[1] / "expected"
SCREENS: dict[str, Callable[[], str]] = {
    "breakpoint": lambda: breakpoint_screen(broken.outcome()),
    "breakpoint-not-within": lambda: breakpoint_screen(broken.outcome(broken.not_within())),
    "breakpoint-below-already": lambda: breakpoint_screen(broken.outcome(broken.below_already())),
    "breakpoint-not-settled": lambda: breakpoint_screen(broken.outcome(broken.not_settled())),
    "breakpoint-not-established": lambda: breakpoint_screen(broken.outcome(broken.not_established())),
}


@pytest.mark.parametrize("name", SCREENS)
def test_a_screen_is_the_one_kept(name: str) -> None:
    text = SCREENS[name]()
    assert text == (EXPECTED / f"{name}.txt").read_text(encoding="utf-8")
    assert max(map(len, text.splitlines())) <= WIDEST


def test_a_background_that_is_declared_too_high_is_said_to_be() -> None:
    found = replace(broken.break_point(), under_peak=-0.0312)
    text = " ".join(breakpoint_screen(broken.outcome(found)).split())
    assert "−3.12 ± 0.04 %" in text
    assert "declared too high by 3.1 %" in text


def test_ten_terms_in_two_regions_fit_a_terminal() -> None:
    (one,) = broken.break_point().distorted
    many = replace(one, coefficients=tuple(0.01 * np.arange(10)))
    other = replace(one, region="a control region with a long name", coefficients=(0.01,))
    found = replace(broken.break_point(), terms=10, distorted=(many, other))
    text = breakpoint_screen(broken.outcome(found))
    assert max(map(len, text.splitlines())) <= WIDEST
    assert "term 10" in text


def test_the_record_has_its_keys_and_is_read_back(tmp_path: Path) -> None:
    record = breakpoint_record(broken.outcome())
    assert (record["format"], record["command"], record["seed"]) == (1, "breakpoint", 1)
    assert record["ending"] == "found"
    assert (record["below"], record["under_peak"], record["rms"]) == (3.0, 0.0312, 0.0268)
    assert record["distortion"][0]["coefficients"] == [0.01, 0.04, -0.02]
    assert {"inputs", "versions", "warnings", "stated_before", "stated_after"} <= set(record)
    write_record(record, tmp_path / "b.json")
    assert read_record(tmp_path / "b.json") == json.loads(record_text(record))


@pytest.mark.parametrize(
    "found", [broken.not_within(), broken.below_already(), broken.not_settled(), broken.not_established()]
)
def test_what_was_not_found_is_null(found: BreakPoint) -> None:
    record = breakpoint_record(broken.outcome(found))
    assert record["under_peak"] is None
    assert record["ending"] == found.ending.name.lower()
    assert record["ending_text"] == found.ending.value
