"""Long work in blocks over worker processes: progress with an estimate, and a Cancel that stops them."""

from __future__ import annotations

import functools
import threading
import time
from collections.abc import Callable, Sequence
from concurrent.futures import FIRST_COMPLETED, Future, wait
from concurrent.futures.process import BrokenProcessPool
from dataclasses import dataclass
from typing import Any

from workbench.widgets.home import Home
from workbench.widgets.jobs.newest import report
from workbench.widgets.jobs.progress import Progress
from workbench.widgets.jobs.work import Stage, Work
from workbench.widgets.jobs.workers import Told, Workers

EVERY = 0.5  # seconds between two lines of progress
IDLE = 120.0  # seconds after which workers with nothing to do are let go


class Blocks:
    """Runs one piece of long work at a time; asking again stops the one under way.

    The result does not depend on the number of workers: blocks carry their own seeds, and are combined in
    their order.

    Args:
        work: how it stands, for whoever shows it.
        home: where results are handed over.
        number: of worker processes; by default one a core, and one core left for the kernel and the page.
    """

    def __init__(self, work: Work, home: Home, number: int | None = None) -> None:
        self.work = work
        self._home, self._number = home, number
        self._workers: Workers | None = None  # kept from one piece of work to the next, until one is stopped
        self._leave: threading.Timer | None = None
        work.observe(self._expect_leave, "standing")

    def start(
        self,
        name: str,
        function: Callable[..., Any],
        blocks: Sequence[tuple[Any, ...]],
        combine: Callable[[list[Any]], Any],
        expected: float | None = None,
    ) -> None:
        """Begin; on the home thread.

        Args:
            name: what it is, in the user's words.
            function: what a worker calls for each block; a public function of a module.
            blocks: its arguments, one tuple a block; at least one.
            combine: makes one result of the blocks' results, in order; runs on a thread.
            expected: what it took the last time [s], where known.
        """
        self._stop()
        self._workers = self._workers or Workers(self._number)
        task = _Task(name, function, tuple(blocks), combine, expected)
        run = _Run(self.work, self._home, self._workers, self.work.ask(name), task)
        threading.Thread(target=run.drive, name="blocks", daemon=True).start()

    def cancel(self) -> None:
        """Stop what is under way, workers included; on the home thread. The last good result stays."""
        self._stop()
        self.work.cancel()

    def close(self) -> None:
        """Cancel, and let the workers go."""
        self.cancel()
        self._let_go()

    def _stop(self) -> None:
        """Let workers go that are busy, or that may have died of what failed."""
        if self.work.standing.stage not in {Stage.IDLE, Stage.DONE, Stage.CANCELLED}:
            self._let_go()

    def _let_go(self) -> None:
        if self._leave is not None:
            self._leave.cancel()
        if self._workers is not None:
            self._workers.stop()
            self._workers = None

    def _expect_leave(self, _: object) -> None:
        """Let the workers go after a while without work; a cell that is run again leaves the old behind."""
        if self._leave is not None:
            self._leave.cancel()
            self._leave = None
        if self.work.standing.stage is not Stage.COMPUTING and self._workers is not None:
            self._leave = threading.Timer(IDLE, self._home.post, [self._leave_idle])
            self._leave.daemon = True
            self._leave.start()

    def _leave_idle(self) -> None:
        if self.work.standing.stage is not Stage.COMPUTING:
            self._let_go()


@dataclass(frozen=True, slots=True)
class _Task:
    name: str
    function: Callable[..., Any]
    blocks: tuple[tuple[Any, ...], ...]
    combine: Callable[[list[Any]], Any]
    expected: float | None


class _Run:
    """One piece of work under way, driven from a thread of its own."""

    def __init__(self, work: Work, home: Home, workers: Workers, ticket: int, task: _Task) -> None:
        self._work, self._home, self._workers, self._ticket, self._task = work, home, workers, ticket, task
        self._began = time.monotonic()

    def drive(self) -> None:
        """Send the blocks to the workers, tell the progress, and hand over what they make."""
        try:
            with self._home.listening():
                told = self._all_blocks()
                result = self._task.combine([one.result for one in told])
        except Exception as error:  # noqa: BLE001 -- shown at home, where it can be seen
            self._home.post(functools.partial(self._report, _explained(error)))
            return
        self._home.post(
            functools.partial(self._home.notices.add_printed, "\n".join(one.printed for one in told))
        )
        self._home.post(functools.partial(self._work.finish, self._ticket, self._task.name, result))

    def _report(self, error: Exception) -> None:
        if self._work.is_wanted(self._ticket):  # else its workers were stopped, and that is no fault
            report(self._work, self._home, self._ticket, error)

    def _all_blocks(self) -> list[Told]:
        waiting = list(enumerate(self._task.blocks))[::-1]
        under_way: dict[Future[Told], int] = {}
        finished: dict[int, Told] = {}
        while waiting or under_way:
            while waiting and len(under_way) < self._workers.number + 1:  # one ready for whoever is free
                place, arguments = waiting.pop()
                under_way[self._workers.submit(self._task.function, *arguments)] = place
            self._tell(len(finished))
            ready, _ = wait(under_way, timeout=EVERY, return_when=FIRST_COMPLETED)
            for future in ready:
                finished[under_way.pop(future)] = future.result()
        return [finished[place] for place in range(len(finished))]

    def _tell(self, done: int) -> None:
        seconds = time.monotonic() - self._began
        progress = Progress(done, len(self._task.blocks), seconds, self._task.expected)
        self._home.post(functools.partial(self._work.advance, self._ticket, progress))


def _explained(error: Exception) -> Exception:
    if isinstance(error, BrokenProcessPool):
        return RuntimeError("a worker process ended by itself, for want of memory perhaps")
    return error
