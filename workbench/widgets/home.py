"""The home thread: every callback of the bench runs there, one after the other, and none fails unseen.

ipykernel delivers widget events on the main thread or on a subshell's, two at a time if it happens so, and
JupyterLab shows nobody what a callback raises or prints.
"""

from __future__ import annotations

import asyncio
import functools
import threading
from collections import deque
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from typing import Any

from workbench.widgets.notices import Notices
from workbench.widgets.printing import Printing


class Home:
    """Runs callbacks on the thread that made it.

    Where that thread has an event loop (a notebook's cell), calls from other threads run in the loop's next
    turns. Without one (a plain script, a test) they wait for `settle`.

    Args:
        notices: where exceptions and printed text go.
    """

    def __init__(self, notices: Notices) -> None:
        self.notices = notices
        self._printing = Printing()
        self._thread = threading.get_ident()
        self._waiting: deque[Callable[[], object]] = deque()
        self._is_inside = False
        self._loop: asyncio.AbstractEventLoop | None
        try:
            self._loop = asyncio.get_running_loop()
        except RuntimeError:
            self._loop = None

    def is_here(self) -> bool:
        """Say whether the caller is on the home thread."""
        return threading.get_ident() == self._thread

    def post(self, call: Callable[[], object]) -> None:
        """Have a call run on the home thread, after those posted before it; from any thread."""
        self._waiting.append(call)
        if self._loop is not None and not self._loop.is_closed():
            self._loop.call_soon_threadsafe(self.settle)

    def later(self, seconds: float, call: Callable[[], object]) -> Callable[[], None]:
        """Have a call run on the home thread after some time; on the home thread.

        Args:
            seconds: how long to wait; without an event loop, until `settle`.
            call: what to run.

        Returns:
            What takes it back, if it has not run yet.
        """
        taken_back = threading.Event()

        def unless_taken_back() -> None:
            if not taken_back.is_set():
                call()

        if self._loop is not None and not self._loop.is_closed():
            self._loop.call_later(seconds, self.post, unless_taken_back)
        else:
            self.post(unless_taken_back)
        return taken_back.set

    def settle(self) -> None:
        """Run everything that waits; on the home thread only.

        Raises:
            RuntimeError: if called on another thread.
        """
        if not self.is_here():
            raise RuntimeError("what waits for the home thread runs nowhere else")
        while self._waiting:
            self._run(self._waiting.popleft())

    def wrap(self, callback: Callable[..., object]) -> Callable[..., None]:
        """Return a callback for `observe`, `on_click` or `on_msg` that runs at home, whoever calls it."""

        @functools.wraps(callback)
        def at_home(*arguments: Any) -> None:
            call = functools.partial(callback, *arguments)
            if not self.is_here():
                self.post(call)
                return
            if not self._is_inside:  # what other threads sent came first
                self.settle()
            self._run(call)

        return at_home

    @contextmanager
    def listening(self) -> Iterator[None]:
        """Hear what this thread prints, and show it among the notices; on any thread."""
        with self._printing.heard(self._tell):
            yield

    def _tell(self, text: str) -> None:
        if self.is_here():
            self.notices.add_printed(text)
        else:
            self.post(functools.partial(self.notices.add_printed, text))

    def _run(self, call: Callable[[], object]) -> None:
        was_inside, self._is_inside = self._is_inside, True
        try:
            with self.listening():
                call()
        except Exception as error:  # noqa: BLE001 -- nobody else would ever see it
            self.notices.add_error(error)
        finally:
            self._is_inside = was_inside
