"""Callbacks run on one thread, in order, and what they raise or print is seen."""

from __future__ import annotations

import asyncio
import sys
import threading
from collections.abc import Callable

import ipywidgets
import pytest

from workbench.errors import InputError, Problem
from workbench.widgets.home import Home
from workbench.widgets.notices import MOST_KEPT, Kind, Notices
from workbench.widgets.printing import Printing

PROBLEM = Problem("Negative count", "line 3", "-1", "a whole number, zero or more", "correct it")


def on_another_thread(call: Callable[[], object]) -> None:
    thread = threading.Thread(target=call)
    thread.start()
    thread.join()


def test_a_callback_that_comes_on_another_thread_runs_at_home_in_turn(home: Home) -> None:
    seen: list[tuple[str, int]] = []
    note = home.wrap(lambda word: seen.append((word, threading.get_ident())))
    on_another_thread(lambda: note("first"))
    assert seen == []
    note("second")
    assert seen == [("first", threading.get_ident()), ("second", threading.get_ident())]


def test_a_widget_changed_on_another_thread_calls_back_at_home(home: Home) -> None:
    control, seen = ipywidgets.IntText(), list[int]()
    control.observe(home.wrap(lambda change: seen.append(threading.get_ident())), "value")
    on_another_thread(lambda: setattr(control, "value", 3))
    home.settle()
    assert seen == [threading.get_ident()]


def test_with_a_loop_posted_calls_run_in_its_next_turns_on_its_thread() -> None:
    async def scene() -> list[int]:
        home, seen = Home(Notices()), list[int]()
        done = asyncio.Event()

        def call() -> None:
            seen.append(threading.get_ident())
            done.set()

        thread = threading.Thread(target=home.wrap(call))
        thread.start()
        await asyncio.wait_for(done.wait(), 5.0)
        thread.join()
        return seen

    assert asyncio.run(scene()) == [threading.get_ident()]


def test_only_the_home_thread_settles(home: Home) -> None:
    caught: list[str] = []

    def elsewhere() -> None:
        try:
            home.settle()
        except RuntimeError as error:
            caught.append(str(error))

    on_another_thread(elsewhere)
    assert caught == ["what waits for the home thread runs nowhere else"]


def test_an_exception_becomes_a_notice_with_its_traceback_and_what_waits_still_runs(home: Home) -> None:
    seen: list[int] = []
    home.post(lambda: 1 / 0)
    home.post(lambda: seen.append(1))
    home.settle()
    (notice,) = home.notices.shown
    assert notice.kind is Kind.FAULT
    assert notice.text == "ZeroDivisionError: division by zero"
    assert "test_home.py" in notice.details
    assert seen == [1]
    home.notices.dismiss()


def test_a_problem_of_the_input_is_told_as_in_the_terminal(home: Home) -> None:
    def refuse() -> None:
        raise InputError(PROBLEM)

    home.wrap(refuse)()
    (notice,) = home.notices.shown
    assert (notice.kind, notice.text, notice.details) == (Kind.PROBLEM, PROBLEM.text(), "")
    home.notices.dismiss()


def test_what_a_callback_prints_or_warns_of_is_a_notice(
    home: Home, capsys: pytest.CaptureFixture[str]
) -> None:
    def talk() -> None:
        print("one")
        print("two", file=sys.stderr)  # where warnings go

    home.wrap(talk)()
    (notice,) = home.notices.shown
    assert notice.kind is Kind.PRINTED
    assert notice.text == "one\ntwo"
    assert capsys.readouterr() == ("", "")
    home.notices.dismiss()


def test_a_callback_inside_a_callback_runs_at_once(home: Home) -> None:
    order: list[str] = []
    inner = home.wrap(lambda: order.append("inner"))

    def outer() -> None:
        inner()
        order.append("outer")

    home.wrap(outer)()
    assert order == ["inner", "outer"]


def test_other_threads_print_where_they_did(capsys: pytest.CaptureFixture[str]) -> None:
    told: list[str] = []
    with Printing().heard(told.append):
        on_another_thread(lambda: print("elsewhere"))
        print("here")
    assert told == ["here\n"]
    assert capsys.readouterr().out == "elsewhere\n"


def test_listeners_that_end_in_any_order_leave_the_streams_as_they_were() -> None:
    before = sys.stdout
    told: list[str] = []
    first, second = Printing(), Printing()
    for _ in range(3):
        begun, ended = threading.Event(), threading.Event()

        def listen(begun: threading.Event = begun, ended: threading.Event = ended) -> None:
            with second.heard(told.append):
                begun.set()
                ended.wait(5.0)
                print("second")

        thread = threading.Thread(target=listen)
        with first.heard(told.append):
            thread.start()
            begun.wait(5.0)
        ended.set()
        thread.join()
    assert told == ["second\n"] * 3
    with first.heard(told.append):
        pass
    assert sys.stdout is before


def test_notices_keep_the_latest_and_one_of_a_row() -> None:
    notices = Notices()
    for number in range(2 * MOST_KEPT):
        notices.add_printed(f"line {number // 2}")
        notices.add_printed("  \n")
    assert [notice.text for notice in notices.shown] == [f"line {number}" for number in range(MOST_KEPT)]
    notices.dismiss()
    assert notices.shown == ()
