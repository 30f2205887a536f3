"""Worker processes that end at once when told to, or when the kernel that started them is gone."""

from __future__ import annotations

import contextlib
import io
import multiprocessing
import os
import threading
from collections.abc import Callable
from concurrent.futures import Future, ProcessPoolExecutor
from dataclasses import dataclass
from multiprocessing.connection import Connection
from typing import Any

from workbench.errors import InputError

# Imported once by the process that all workers are forked from, so that a new worker is there at once.
_PRELOADED = ["workbench.evidence.weigh", "workbench.ensembles.adequacy"]


@dataclass(frozen=True, slots=True)
class Told:
    """What a worker sends back.

    Attributes:
        result: what the function returned.
        printed: what it printed, warnings included.
    """

    result: Any
    printed: str


class WorkerError(RuntimeError):
    """What a worker raised, said in words: not every exception survives the way between processes."""


class Workers:
    """A pool of worker processes, started when first needed; stopped once and for all by `stop`.

    Args:
        number: how many; by default one a core, and one core left for the kernel and the page.
    """

    def __init__(self, number: int | None = None) -> None:
        self.number = number or max(1, (os.cpu_count() or 2) - 1)
        methods = multiprocessing.get_all_start_methods()
        context = multiprocessing.get_context("forkserver" if "forkserver" in methods else "spawn")
        context.set_forkserver_preload(_PRELOADED)
        watched, self._lifeline = context.Pipe(duplex=False)
        self._pool = ProcessPoolExecutor(
            self.number, mp_context=context, initializer=_begin, initargs=(watched,)
        )

    def submit(self, function: Callable[..., Any], *arguments: Any) -> Future[Told]:
        """Have a worker call a function; from any thread.

        Args:
            function: a public function of a module, so that a worker finds it.
            arguments: what it gets.

        Raises:
            RuntimeError: after `stop`.
        """
        return self._pool.submit(_call, function, *arguments)

    def stop(self) -> None:
        """End every worker, whatever it does; calls under way raise `BrokenProcessPool`."""
        self._lifeline.close()
        self._pool.shutdown(wait=False, cancel_futures=True)


def _begin(lifeline: Connection) -> None:
    """Let this worker end when the other end of the lifeline is closed, and let the kernel go first."""
    if hasattr(os, "nice"):
        os.nice(5)
    threading.Thread(target=_end_with, args=(lifeline,), name="lifeline", daemon=True).start()


def _end_with(lifeline: Connection) -> None:
    with contextlib.suppress(EOFError, OSError):
        lifeline.recv_bytes()
    os._exit(1)


def _call(function: Callable[..., Any], *arguments: Any) -> Told:
    """Call a function and keep what it prints: nobody sees a worker's standard output."""
    printed = io.StringIO()
    with contextlib.redirect_stdout(printed), contextlib.redirect_stderr(printed):
        try:
            result = function(*arguments)
        except InputError:
            raise
        except Exception as error:
            before = f"\nprinted before: {printed.getvalue()}" if printed.getvalue() else ""
            raise WorkerError(f"{type(error).__name__}: {error}{before}") from error
    return Told(result, printed.getvalue())
