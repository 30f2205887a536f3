"""A control and the state agree, both ways, and only the state decides."""

from __future__ import annotations

import threading
from typing import Any

import ipywidgets
import pytest
import traitlets

from tests.widgets.front_end import FrontEnd
from workbench.errors import InputError, Problem
from workbench.widgets.binding import bind
from workbench.widgets.home import Home
from workbench.widgets.number import Number
from workbench.widgets.plain import Plain

NEGATIVE = Problem("Negative strength", "strength", "-3", "zero or more", "type 0")


class State(traitlets.HasTraits):
    strength = traitlets.Float(1.0)
    title = traitlets.Unicode("Tern")
    family = traitlets.Unicode("uniform")

    @traitlets.validate("strength")
    def _check(self, proposal: dict[str, Any]) -> float:
        if proposal["value"] < 0.0:
            raise InputError(NEGATIVE)
        return round(float(proposal["value"]), 6)


@pytest.fixture
def state() -> State:
    return State()


@pytest.fixture
def number(front: FrontEnd, home: Home, state: State) -> Number:
    made = Number(label="strength", low=0.0, high=5.0, step=0.1)
    bind(home, state, "strength", made)
    return made


def test_the_control_begins_with_what_the_state_holds(number: Number, front: FrontEnd) -> None:
    assert front.state(number)["value"] == 1.0


def test_a_request_changes_the_state_once_and_is_answered_in_one_message(
    number: Number, front: FrontEnd, state: State
) -> None:
    told: list[float] = []
    state.observe(lambda change: told.append(change["new"]), "strength")
    before = len(front.updates(number))
    front.send(number, asked=2.5, number=1)
    assert (state.strength, told) == (2.5, [2.5])
    assert front.updates(number)[before:] == [{"value": 2.5, "answered": 1}]


def test_the_state_moves_the_control_and_asks_nothing_back(
    number: Number, front: FrontEnd, state: State
) -> None:
    told: list[float] = []
    state.observe(lambda change: told.append(change["new"]), "strength")
    state.strength = 3.0
    assert (front.state(number)["value"], told) == (3.0, [3.0])


def test_a_state_beyond_the_range_is_shown_as_it_is(number: Number, front: FrontEnd, state: State) -> None:
    state.strength = 99.0
    assert (front.state(number)["value"], state.strength) == (99.0, 99.0)


def test_a_narrower_range_changes_nothing(number: Number, front: FrontEnd, state: State) -> None:
    """With a slider of ipywidgets, lowering its maximum lowered the state."""
    state.strength = 4.0
    number.low, number.high = 0.0, 2.0
    assert (state.strength, front.state(number)["value"]) == (4.0, 4.0)
    slider, linked = ipywidgets.FloatSlider(max=5.0), State()
    traitlets.link((linked, "strength"), (slider, "value"))
    linked.strength = 4.0
    slider.max = 2.0
    assert linked.strength == 2.0  # what would go wrong


def test_what_the_state_refuses_is_undone_with_the_reason_below(
    number: Number, front: FrontEnd, state: State
) -> None:
    front.send(number, asked=-3.0, number=1)
    shown = front.state(number)
    assert (state.strength, shown["value"], shown["answered"]) == (1.0, 1.0, 1)
    assert shown["problem"] == NEGATIVE.text()
    front.send(number, asked=2.0, number=2)
    assert front.state(number)["problem"] == ""


def test_words_where_a_number_belongs_are_refused_with_the_words(
    number: Number, front: FrontEnd, state: State
) -> None:
    front.send(number, asked="two", number=1)
    assert state.strength == 1.0
    assert '"two"' in front.state(number)["problem"]


def test_what_the_state_rounds_is_shown_rounded(number: Number, front: FrontEnd, state: State) -> None:
    front.send(number, asked=0.12345678, number=1)
    assert front.state(number)["value"] == state.strength == 0.123457


def test_requests_on_another_thread_wait_for_home(
    home: Home, number: Number, front: FrontEnd, state: State
) -> None:
    thread = threading.Thread(target=lambda: front.send(number, asked=2.5, number=1))
    thread.start()
    thread.join()
    assert state.strength == 1.0
    home.settle()
    assert state.strength == 2.5


def test_a_text_is_tied_both_ways(front: FrontEnd, home: Home, state: State) -> None:
    text = ipywidgets.Text(description="title")
    bind(home, state, "title", Plain(text))
    front.change(text, value="Skerry")
    assert state.title == "Skerry"
    state.title = "Sorrel"
    assert front.state(text)["value"] == "Sorrel"


def test_a_refused_text_is_undone_with_the_reason_below(front: FrontEnd, home: Home) -> None:
    class Named(traitlets.HasTraits):
        name = traitlets.Unicode("a")

        @traitlets.validate("name")
        def _check(self, proposal: dict[str, Any]) -> str:
            if not proposal["value"]:
                raise InputError(Problem("No <name>", "name", "nothing", "a word", "type one"))
            return str(proposal["value"])

    text, named = ipywidgets.Text(description="name"), Named()
    plain = Plain(text)
    bind(home, named, "name", plain)
    front.change(text, value="")
    assert (named.name, front.state(text)["value"]) == ("a", "a")
    assert "No &lt;name&gt;" in plain.view.children[1].value
    front.change(text, value="b")
    assert plain.view.children[1].value == ""


def test_other_choices_leave_the_state_alone_and_show_what_is_not_offered_as_none(
    front: FrontEnd, home: Home, state: State
) -> None:
    """ipywidgets picks the first of the new options by itself, and a plain link would ask for it."""
    choice = Plain(ipywidgets.Dropdown(options=["uniform", "normal", "gamma"], description="family"))
    bind(home, state, "family", choice)
    front.change(choice.control, index=1)
    assert state.family == "normal"
    choice.offer(["gamma", "normal"], state.family)
    assert (state.family, front.state(choice.control)["index"]) == ("normal", 1)
    choice.offer(["gamma", "beta"], state.family)
    assert (state.family, choice.control.index) == ("normal", None)
    front.change(choice.control, index=1)
    assert state.family == "beta"


def test_controls_whose_range_changes_their_value_are_not_taken(front: FrontEnd) -> None:
    with pytest.raises(TypeError, match="FloatSlider changes its value with its range; use Number"):
        Plain(ipywidgets.FloatSlider())


def test_a_fault_in_the_state_is_a_notice(front: FrontEnd, home: Home, number: Number, state: State) -> None:
    state.observe(lambda change: 1 / 0, "strength")
    front.send(number, asked=2.0, number=1)
    assert [notice.text for notice in home.notices.shown] == ["ZeroDivisionError: division by zero"]
    assert front.state(number)["answered"] == 1
    home.notices.dismiss()
