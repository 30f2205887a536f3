"""The lines that tell what went wrong and how the work stands say it to everyone, and can be answered."""

from __future__ import annotations

import pytest

from tests.widgets.front_end import FrontEnd
from workbench.errors import InputError, Problem
from workbench.widgets.error_line import ErrorLine
from workbench.widgets.home import Home
from workbench.widgets.jobs.progress import Progress
from workbench.widgets.jobs.work import Work
from workbench.widgets.work_line import WorkLine


def test_the_error_line_takes_no_room_until_something_happens(front: FrontEnd, home: Home) -> None:
    line = ErrorLine(home)
    text, button = line.view.children
    assert line.view.layout.display == "none"

    def fail() -> None:
        raise InputError(Problem("Count <0", "line 3", "-1", "zero or more", "correct it"))

    home.wrap(fail)()
    home.wrap(lambda: 1 / 0)()
    assert line.view.layout.display == "flex"
    shown = front.state(text)["value"]
    assert shown.startswith('<div role="alert">')
    assert "Count &lt;0\n  where     line 3" in shown
    assert "<summary>What to send to whoever keeps oddsbench</summary>" in shown
    front.click(button)
    assert (front.state(text)["value"], line.view.layout.display) == ("", "none")


def test_cancel_can_be_pressed_only_while_it_computes(front: FrontEnd, home: Home) -> None:
    work = Work()
    line = WorkLine(home, work, work.cancel)
    text, button = line.view.children
    assert button.disabled
    ticket = work.ask("a <long> run")
    work.advance(ticket, Progress(1, 4, 2.0))
    shown = front.state(text)["value"]
    assert '<progress max="1" value="0.250" aria-label="Progress of a &lt;long&gt; run">' in shown
    assert "25 %, about 6 s left" in shown
    assert '<span role="status"' in shown
    front.click(button)
    assert "Cancelled: a &lt;long&gt; run" in front.state(text)["value"]
    assert button.disabled


@pytest.mark.parametrize("ending", ["finish", "fail"])
def test_the_line_tells_how_it_ended(front: FrontEnd, home: Home, ending: str) -> None:
    work = Work()
    line = WorkLine(home, work, work.cancel)
    ticket = work.ask("odds")
    if ending == "finish":
        work.finish(ticket, "odds", 1.0)
    else:
        work.fail(ticket, "no bins")
    expected = {"finish": "Shown: odds", "fail": "Could not compute odds: no bins"}[ending]
    assert expected in front.state(line.view.children[0])["value"]
