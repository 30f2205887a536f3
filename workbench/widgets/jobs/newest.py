"""Short work beside the home thread, for sliders: one thread, the newest request wins."""

from __future__ import annotations

import functools
import threading
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

from workbench.errors import InputError
from workbench.widgets.home import Home
from workbench.widgets.jobs.work import Work


@dataclass(frozen=True, slots=True)
class _Request:
    ticket: int
    name: str
    call: Callable[[], Any]


class Newest:
    """Computes the newest request on a thread; requests that came between are never begun.

    Args:
        work: how it stands, for whoever shows it.
        home: where results are handed over.
        compute: what to compute; well below a second, since a thread can't be stopped: longer work belongs
            to `Blocks`.
        on_the_way: show results that were overtaken while they were computed.
    """

    def __init__(
        self, work: Work, home: Home, compute: Callable[..., Any], *, on_the_way: bool = True
    ) -> None:
        self.work = work
        self._home, self._compute, self._on_the_way = home, compute, on_the_way
        self._lock = threading.Lock()
        self._next: _Request | None = None
        self._runner: object | None = None  # stands for the thread that may take the next request

    def request(self, name: str, *arguments: Any) -> None:
        """Ask for a result; on the home thread.

        Args:
            name: what it is, in the user's words.
            arguments: what `compute` gets; nobody may change them afterwards.
        """
        call = functools.partial(self._compute, *arguments)
        with self._lock:
            self._next = _Request(self.work.ask(name), name, call)
            if self._runner is None:
                self._runner = object()
                threading.Thread(
                    target=self._run, args=(self._runner,), name="newest request", daemon=True
                ).start()

    def cancel(self) -> None:
        """Drop what is asked; on the home thread. A thread that computes is left to end by itself."""
        with self._lock:
            self._next = self._runner = None
        self.work.cancel()

    def _run(self, runner: object) -> None:
        while (request := self._take(runner)) is not None:
            self._home.post(self._computed(request))

    def _take(self, runner: object) -> _Request | None:
        with self._lock:
            if self._runner is not runner:  # cancelled: the next request has a thread of its own
                return None
            request, self._next = self._next, None
            if request is None:
                self._runner = None
            return request

    def _computed(self, request: _Request) -> Callable[[], object]:
        """Return what to do at home about a request, computed here."""
        try:
            with self._home.listening():
                result = request.call()
        except Exception as error:  # noqa: BLE001 -- shown at home, where it can be seen
            return functools.partial(report, self.work, self._home, request.ticket, error)
        finish = functools.partial(self.work.finish, request.ticket, request.name, result)
        return functools.partial(finish, on_the_way=self._on_the_way)


def report(work: Work, home: Home, ticket: int, error: BaseException) -> None:
    """Tell why something could not be computed: beside the work, and a fault of ours among the notices too.

    Args:
        work: what it was for.
        home: with the notices.
        ticket: of the request.
        error: what was raised.
    """
    work.fail(ticket, str(error) or type(error).__name__)
    if not isinstance(error, InputError):
        home.notices.add_error(error)
