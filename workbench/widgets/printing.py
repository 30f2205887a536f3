"""Hears what one thread prints and lets the others print as before."""

from __future__ import annotations

import contextlib
import io
import sys
import threading
from collections.abc import Callable, Iterator
from typing import TextIO


class _Ear(io.TextIOBase):
    """A stream in place of standard output or error: keeps what listeners write, passes on others'."""

    def __init__(self, beyond: TextIO) -> None:
        self.beyond = beyond
        self.heard: dict[int, list[str]] = {}

    def write(self, text: str) -> int:
        """Keep a listening thread's text; write another's where it would have gone."""
        kept = self.heard.get(threading.get_ident())
        if kept is None:
            return self.beyond.write(text)
        kept.append(text)
        return len(text)

    def flush(self) -> None:
        """Flush what was passed on."""
        self.beyond.flush()

    def isatty(self) -> bool:
        """Say that nobody sits behind this stream."""
        return False


class Printing:
    """Listens to any number of threads at once; standard output and error are replaced only while it does."""

    def __init__(self) -> None:
        self._lock = threading.Lock()
        self._ears: dict[str, _Ear] = {}
        self._listening = 0

    @contextlib.contextmanager
    def heard(self, tell: Callable[[str], None]) -> Iterator[None]:
        """Listen to this thread, and afterwards tell what it printed.

        Args:
            tell: called with the text where there was any, also after an exception.
        """
        thread, kept = threading.get_ident(), list[str]()
        with self._lock:
            self._begin()
            ears = tuple(self._ears.values())
            outer = ears[0].heard.get(thread)
            for ear in ears:
                ear.heard[thread] = kept
        try:
            yield
        finally:
            with self._lock:
                for ear in ears:
                    if outer is None:
                        del ear.heard[thread]
                    else:
                        ear.heard[thread] = outer
                self._end()
            if kept:
                tell("".join(kept))

    def _begin(self) -> None:
        self._listening += 1
        if self._listening == 1:
            self._ears = {name: _Ear(_unwrapped(getattr(sys, name))) for name in ("stdout", "stderr")}
            for name, ear in self._ears.items():
                setattr(sys, name, ear)

    def _end(self) -> None:
        self._listening -= 1
        if self._listening == 0:
            for name, ear in self._ears.items():
                if getattr(sys, name) is ear:  # else another took its place, and passes on to this one
                    setattr(sys, name, ear.beyond)


def _unwrapped(stream: TextIO) -> TextIO:
    """Return the stream beyond those that stopped listening, so that they do not pile up."""
    while isinstance(stream, _Ear) and not stream.heard:
        stream = stream.beyond
    return stream
