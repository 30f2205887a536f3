"""How a piece of work stands, without a thread: what is taken, what is dropped, what stays."""

from __future__ import annotations

import pytest

from workbench.widgets.jobs.progress import Progress, duration
from workbench.widgets.jobs.work import Stage, Work


def test_a_result_that_was_asked_for_is_shown_with_its_name() -> None:
    work = Work()
    assert work.standing.text() == ""
    ticket = work.ask("odds at strength 1")
    assert work.standing.text() == "Computing odds at strength 1"
    assert work.finish(ticket, "odds at strength 1", 7.0)
    assert (work.standing.result, work.standing.text()) == (7.0, "Shown: odds at strength 1")
    assert not work.standing.is_stale


def test_while_the_next_is_computed_the_last_stays_stale_and_named() -> None:
    work = Work()
    work.finish(work.ask("first"), "first", 1.0)
    work.ask("second")
    assert (work.standing.result, work.standing.is_stale) == (1.0, True)
    assert work.standing.caption == "Still shown: first"


def test_a_result_that_was_overtaken_is_dropped() -> None:
    work = Work()
    old, new = work.ask("old"), work.ask("new")
    assert not work.finish(old, "old", 1.0)
    assert work.standing.stage is Stage.COMPUTING
    assert work.finish(new, "new", 2.0)
    assert not work.finish(old, "old", 1.0)
    assert work.standing.result == 2.0


def test_on_the_way_an_overtaken_result_is_shown_but_never_after_a_newer_one() -> None:
    work = Work()
    first, second, third = work.ask("1"), work.ask("2"), work.ask("3")
    assert work.finish(second, "2", 2.0, on_the_way=True)
    assert (work.standing.stage, work.standing.shown, work.standing.asked) == (Stage.COMPUTING, "2", "3")
    assert work.standing.is_stale
    assert not work.finish(first, "1", 1.0, on_the_way=True)
    assert work.finish(third, "3", 3.0, on_the_way=True)
    assert work.standing.stage is Stage.DONE


@pytest.mark.parametrize("on_the_way", [False, True])
def test_after_cancel_nothing_comes_and_the_last_good_result_stays(on_the_way: bool) -> None:
    work = Work()
    work.finish(work.ask("good"), "good", 1.0)
    ticket = work.ask("slow")
    work.cancel()
    assert not work.is_wanted(ticket)
    assert not work.finish(ticket, "slow", 2.0, on_the_way=on_the_way)
    work.fail(ticket, "too late")
    work.advance(ticket, Progress(1, 2, 1.0))
    assert work.standing.stage is Stage.CANCELLED
    assert (work.standing.result, work.standing.caption) == (1.0, "Still shown: good")
    assert work.finish(work.ask("next"), "next", 3.0)


def test_cancel_when_nothing_is_computed_changes_nothing() -> None:
    work = Work()
    work.cancel()
    assert [work.standing.stage] == [Stage.IDLE]
    work.finish(work.ask("good"), "good", 1.0)
    work.cancel()
    assert work.standing.stage is Stage.DONE


def test_a_failure_says_why_and_keeps_the_last_good_result() -> None:
    work = Work()
    work.finish(work.ask("good"), "good", 1.0)
    overtaken, ticket = work.ask("bad"), work.ask("worse")
    work.fail(overtaken, "of no interest any more")
    assert work.standing.stage is Stage.COMPUTING
    work.fail(ticket, "no bins")
    assert work.standing.text() == "Could not compute worse: no bins"
    assert (work.standing.result, work.standing.is_stale) == (1.0, True)


def test_what_was_about_something_else_is_forgotten() -> None:
    work = Work()
    work.finish(work.ask("old file"), "old file", 1.0)
    ticket = work.ask("old file, again")
    work.forget()
    assert not work.finish(ticket, "old file, again", 2.0, on_the_way=True)
    assert (work.standing.result, work.standing.stage) == (None, Stage.IDLE)


def test_every_change_is_told_once() -> None:
    work, told = Work(), list[Stage]()
    work.observe(lambda change: told.append(change["new"].stage), "standing")
    ticket = work.ask("a")
    work.advance(ticket, Progress(1, 4, 2.0))
    work.finish(ticket, "a", 1.0)
    assert told == [Stage.COMPUTING, Stage.COMPUTING, Stage.DONE]


@pytest.mark.parametrize(
    ("progress", "share", "remaining", "text"),
    [
        (Progress(0, 8, 3.0), 0.0, None, "for 3 s"),
        (Progress(2, 8, 3.0), 0.25, 9.0, "25 %, about 9 s left"),  # 1.5 s a block, 6 blocks
        (Progress(0, 1, 3.0, 12.0), 0.25, 9.0, "25 %, about 9 s left"),
        (Progress(0, 1, 30.0, 12.0), 0.95, 0.0, "95 %, about 1 s left"),
        (Progress(1, 100, 10.0), 0.01, 990.0, "1 %, about 16 min left"),
    ],
)
def test_progress_is_told_with_an_estimate_by_hand(
    progress: Progress, share: float, remaining: float | None, text: str
) -> None:
    assert progress.share == pytest.approx(share)
    assert progress.remaining == remaining
    assert progress.text() == text


def test_times_are_no_finer_than_anyone_needs() -> None:
    assert [duration(seconds) for seconds in (0.2, 75.0, 600.0, 7200.0)] == ["1 s", "75 s", "10 min", "2.0 h"]
