"""A home whose notices a test must have asked for, and jobs that are waited for without a browser."""

from __future__ import annotations

import time
from collections.abc import Callable, Iterator

import pytest

from tests.widgets.front_end import FrontEnd, front_end
from workbench.widgets.home import Home
from workbench.widgets.notices import Notices

PATIENCE = 20.0  # seconds that a test waits at most


@pytest.fixture
def home() -> Iterator[Home]:
    """Yield a home; whatever a callback raised or printed fails the test, unless the test dismissed it."""
    made = Home(Notices())
    yield made
    made.settle()
    assert [notice.text + notice.details for notice in made.notices.shown] == []


@pytest.fixture
def until(home: Home) -> Callable[[Callable[[], bool]], None]:
    """Return a function that lets things happen at home until a condition holds."""

    def wait(condition: Callable[[], bool]) -> None:
        end = time.monotonic() + PATIENCE
        while not condition():
            assert time.monotonic() < end, "it did not happen"
            home.settle()
            time.sleep(0.002)

    return wait


@pytest.fixture
def front(monkeypatch: pytest.MonkeyPatch) -> FrontEnd:
    """Return a front end for the widgets that a test makes."""
    return front_end(monkeypatch)
