"""A size is read back as it was shown, and what may mean two things is asked about."""

from __future__ import annotations

import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from workbench.errors import InputError
from workbench.records.descriptions import percent
from workbench.widgets.state.sizes import size_of_text, size_text

WHERE = "uncertainties.rate.effects.fakes"


@given(st.floats(-1.0, 1e6).filter(lambda size: size == 0.0 or abs(size) > 1e-100))
@settings(max_examples=1000, deadline=None, derandomize=True)
def test_what_is_shown_is_read_back_to_the_last_digit(size: float) -> None:
    assert size_of_text(size_text(size), (), WHERE) == size


@pytest.mark.parametrize("size", [0.1, 0.07, -0.04, 0.015, 1.5, 0.0725, 0.29])
def test_it_is_shown_as_the_terminal_shows_it(size: float) -> None:
    assert size_text(size) == percent(size)


@pytest.mark.parametrize(
    ("text", "size"),
    [
        ("10 %", 0.1),
        ("+10%", 0.1),
        (" -4 % ", -0.04),
        ("−4 %", -0.04),
        ("0.07", 0.07),
        (".5", 0.5),
        ("150 %", 1.5),
        ("1e1 %", 0.1),
        ("fakes hard", "fakes hard"),
        ("7", "7"),
    ],
)
def test_what_is_typed_is_understood(text: str, size: float | str) -> None:
    """A column may be called 7; a name that is there is what is meant."""
    assert size_of_text(text, ("fakes hard", "7"), WHERE) == size


def test_nothing_is_shown_for_a_side_that_is_not_there() -> None:
    assert size_text(None) == ""
    assert size_text("fakes hard") == "fakes hard"


@pytest.mark.parametrize(
    ("text", "what", "remedy"),
    [
        ("10", "A size that may be meant in per cent", "write 10 % if per cent is meant"),
        ("fakes hart", "A size that cannot be read", 'write "fakes hard"'),
        ("", "A size that cannot be read", "write a number and %"),
        ("nan", "A size that cannot be read", "use one of: fakes hard"),
        ("1e9999 %", "A size that cannot be read", "use one of: fakes hard"),
    ],
)
def test_what_cannot_be_understood_is_refused(text: str, what: str, remedy: str) -> None:
    with pytest.raises(InputError) as caught:
        size_of_text(text, ("fakes hard",), WHERE)
    (problem,) = caught.value.problems
    assert (problem.what, problem.remedy, problem.where) == (what, remedy, WHERE)


@given(st.text(alphabet="0123456789.,eE+-−% x", max_size=12))
@settings(max_examples=500, deadline=None, derandomize=True)
def test_whatever_is_typed_is_a_size_or_a_problem(text: str) -> None:
    try:
        size = size_of_text(text, (), WHERE)
    except InputError as error:
        told = [line for problem in error.problems for line in problem.text().split("\n")]
    else:
        told = [repr(size)]
        assert isinstance(size, float)
        assert not math.isnan(size)
    assert told
    assert all(line.strip() for line in told)
