"""Long work in worker processes: the same result for any number of them, progress, and a Cancel."""

from __future__ import annotations

import os
import time
from collections.abc import Callable, Iterator
from functools import partial

import numpy as np
import pytest

from tests.widgets.jobs import slow_blocks
from workbench.widgets.home import Home
from workbench.widgets.jobs.blocks import Blocks
from workbench.widgets.jobs.work import Stage, Work

Until = Callable[[Callable[[], bool]], None]


@pytest.fixture
def blocks(home: Home) -> Iterator[Blocks]:
    made = Blocks(Work(), home, number=1)
    yield made
    made.close()


def is_alive(process: int) -> bool:
    try:
        os.kill(process, 0)
    except ProcessLookupError:
        return False
    return True


def is_gone(process: int) -> bool:
    return not is_alive(process)


def seeded(number: int) -> list[tuple[np.random.SeedSequence, int]]:
    return [(child, 1000) for child in np.random.SeedSequence(7).spawn(number)]


@pytest.mark.parametrize("number", [1, 3])
def test_the_result_is_that_of_one_plain_loop_for_any_number_of_workers(
    home: Home, until: Until, number: int
) -> None:
    plain = [slow_blocks.mean_of_normal(*arguments) for arguments in seeded(7)]
    run = Blocks(Work(), home, number)
    run.start("means", slow_blocks.mean_of_normal, seeded(7), list)
    until(lambda: run.work.standing.stage is not Stage.COMPUTING)
    assert run.work.standing.result == plain
    run.close()


def test_progress_is_told_block_by_block(blocks: Blocks, until: Until) -> None:
    told: list[int] = []
    blocks.work.observe(
        lambda change: told.append(change["new"].progress.done if change["new"].progress else -1), "standing"
    )
    blocks.start("busy", slow_blocks.busy, [(0.02,)] * 5, len)
    until(lambda: blocks.work.standing.stage is Stage.DONE)
    done = [number for number in told if number >= 0]
    assert done == sorted(done)
    assert {0, 4} <= set(done)


def test_cancel_ends_the_worker_within_0_4_s_while_it_computes(blocks: Blocks, until: Until) -> None:
    took = []
    for _ in range(3):
        blocks.start("who", slow_blocks.busy, [(0.0,)], lambda results: results[0])
        until(lambda: blocks.work.standing.stage is Stage.DONE)
        worker = blocks.work.standing.result
        blocks.start("forever", slow_blocks.busy, [(600.0,)], len)
        until(lambda: blocks.work.standing.progress is not None)
        time.sleep(0.2)
        assert is_alive(worker)
        before = time.monotonic()
        blocks.cancel()
        assert blocks.work.standing.stage is Stage.CANCELLED
        until(partial(is_gone, worker))
        took.append(time.monotonic() - before)
        assert blocks.work.standing.result == worker
    assert sorted(took)[1] < 0.4


def test_what_a_stopped_run_still_raises_is_no_fault(home: Home, blocks: Blocks, until: Until) -> None:
    """Now and then Cancel was followed by a notice that a worker had ended by itself."""
    blocks.start("forever", slow_blocks.busy, [(600.0,)], len)
    until(lambda: blocks.work.standing.progress is not None)
    assert blocks._workers is not None
    blocks._workers.stop()
    time.sleep(0.5)  # the thread has seen it by now, home has not
    blocks.cancel()
    home.settle()
    assert blocks.work.standing.stage is Stage.CANCELLED


def test_after_cancel_the_next_piece_of_work_has_workers_again(blocks: Blocks, until: Until) -> None:
    blocks.start("forever", slow_blocks.busy, [(600.0,)] * 3, len)
    blocks.cancel()
    blocks.start("short", slow_blocks.busy, [(0.0,)] * 3, len)
    until(lambda: blocks.work.standing.stage is Stage.DONE)
    assert blocks.work.standing.result == 3


def test_workers_with_nothing_to_do_are_let_go(
    blocks: Blocks, until: Until, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Each time its cell was run again, the bench left its idle workers behind."""
    monkeypatch.setattr("workbench.widgets.jobs.blocks.IDLE", 0.3)
    blocks.start("who", slow_blocks.busy, [(0.0,)], lambda results: results[0])
    until(lambda: blocks.work.standing.stage is Stage.DONE)
    worker = blocks.work.standing.result
    blocks.start("longer than idle", slow_blocks.busy, [(0.6,)], lambda results: results[0])
    until(lambda: blocks.work.standing.stage is Stage.DONE)
    assert blocks.work.standing.result == worker
    until(partial(is_gone, worker))


def test_asking_again_stops_what_is_under_way(blocks: Blocks, until: Until) -> None:
    blocks.start("forever", slow_blocks.busy, [(600.0,)], len)
    until(lambda: blocks.work.standing.progress is not None)
    blocks.start("short", slow_blocks.busy, [(0.0,)], len)
    until(lambda: blocks.work.standing.stage is Stage.DONE)
    assert blocks.work.standing.shown == "short"


def test_a_problem_found_by_a_worker_is_told_as_it_is(blocks: Blocks, until: Until) -> None:
    blocks.start("it", slow_blocks.refuse, [()], len)
    until(lambda: blocks.work.standing.stage is Stage.FAILED)
    assert blocks.work.standing.why == slow_blocks.PROBLEM.text()


def test_an_exception_that_cannot_travel_is_told_in_words(home: Home, blocks: Blocks, until: Until) -> None:
    blocks.start("it", slow_blocks.break_down, [()], len)
    until(lambda: blocks.work.standing.stage is Stage.FAILED)
    assert blocks.work.standing.why == "Unpicklable: two arguments"
    assert "slow_blocks.py" in home.notices.shown[0].details
    home.notices.dismiss()


def test_what_a_worker_prints_is_a_notice(home: Home, blocks: Blocks, until: Until) -> None:
    blocks.start("it", slow_blocks.talk, [()], len)
    until(lambda: blocks.work.standing.stage is Stage.DONE)
    assert home.notices.shown[0].text == "from afar\nand a warning"
    home.notices.dismiss()


def test_a_worker_that_ends_by_itself_is_told(home: Home, blocks: Blocks, until: Until) -> None:
    blocks.start("it", slow_blocks.die, [()], len)
    until(lambda: blocks.work.standing.stage is Stage.FAILED)
    assert blocks.work.standing.why == "a worker process ended by itself, for want of memory perhaps"
    home.notices.dismiss()
    blocks.start("it", slow_blocks.busy, [(0.0,)], len)
    until(lambda: blocks.work.standing.stage is Stage.DONE)
