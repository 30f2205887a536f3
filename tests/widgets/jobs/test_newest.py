"""Requests of a slider: the newest wins, nothing stale is shown, Cancel does not wait."""

from __future__ import annotations

import threading
import time
from collections.abc import Callable

import numpy as np

from tests.widgets.jobs.slow_blocks import PROBLEM
from workbench.errors import InputError
from workbench.widgets.home import Home
from workbench.widgets.jobs.newest import Newest
from workbench.widgets.jobs.work import Stage, Work

Until = Callable[[Callable[[], bool]], None]


class Gate:
    """Computes only when let through, and remembers what it began."""

    def __init__(self) -> None:
        self.begun: list[int] = []
        self.passes = threading.Semaphore(0)

    def compute(self, value: int) -> int:
        self.begun.append(value)
        assert self.passes.acquire(timeout=10.0)
        return value


def test_requests_between_the_first_and_the_newest_are_never_begun(home: Home, until: Until) -> None:
    gate, work = Gate(), Work()
    newest = Newest(work, home, gate.compute, on_the_way=False)
    newest.request("0", 0)
    until(lambda: gate.begun == [0])
    for value in range(1, 6):
        newest.request(str(value), value)
    gate.passes.release(2)
    until(lambda: work.standing.stage is Stage.DONE)
    assert gate.begun == [0, 5]
    assert (work.standing.result, work.standing.shown) == (5, "5")


def test_on_the_way_results_are_shown_in_order_up_to_the_newest(home: Home, until: Until) -> None:
    gate, work, seen = Gate(), Work(), list[int]()
    work.observe(lambda change: seen.append(change["new"].result), "standing")
    newest = Newest(work, home, gate.compute)
    newest.request("0", 0)
    until(lambda: gate.begun == [0])
    newest.request("1", 1)
    gate.passes.release()
    until(lambda: work.standing.result == 0)
    assert work.standing.is_stale
    gate.passes.release()
    until(lambda: work.standing.stage is Stage.DONE)
    assert [value for value in seen if value is not None] == [0, 1]


def test_cancel_is_immediate_and_the_next_request_does_not_wait_for_what_was_dropped(
    home: Home, until: Until
) -> None:
    gate, work = Gate(), Work()
    newest = Newest(work, home, gate.compute)
    newest.request("slow", 0)
    until(lambda: gate.begun == [0])
    newest.cancel()
    assert work.standing.stage is Stage.CANCELLED
    newest.request("next", 1)
    until(lambda: gate.begun == [0, 1])
    gate.passes.release(2)
    until(lambda: work.standing.stage is Stage.DONE)
    assert work.standing.result == 1


def test_home_answers_while_a_thread_computes(home: Home, until: Until) -> None:
    matrix, work = np.random.default_rng(1).normal(size=(300, 300)), Work()
    newest = Newest(work, home, lambda: [np.linalg.svd(matrix) for _ in range(20)])
    newest.request("decompositions")
    waited = []
    while work.standing.stage is not Stage.DONE:
        before = time.monotonic()
        home.settle()
        waited.append(time.monotonic() - before)
        time.sleep(0.005)
    assert len(waited) > 3
    assert sorted(waited)[len(waited) // 2] < 0.1


def test_a_problem_stands_beside_the_work_and_a_fault_among_the_notices_too(home: Home, until: Until) -> None:
    def compute(error: Exception) -> None:
        raise error

    work = Work()
    newest = Newest(work, home, compute)
    newest.request("it", InputError(PROBLEM))
    until(lambda: work.standing.stage is Stage.FAILED)
    assert work.standing.why == PROBLEM.text()
    assert not home.notices.shown
    newest.request("it", ZeroDivisionError("nothing to divide by"))
    until(lambda: work.standing.why == "nothing to divide by")
    assert [notice.text for notice in home.notices.shown] == ["ZeroDivisionError: nothing to divide by"]
    home.notices.dismiss()


def test_what_the_thread_prints_is_a_notice(home: Home, until: Until) -> None:
    work = Work()
    Newest(work, home, lambda: [print("aside")]).request("it")
    until(lambda: work.standing.stage is Stage.DONE)
    assert [notice.text for notice in home.notices.shown] == ["aside"]
    home.notices.dismiss()
