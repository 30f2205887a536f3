"""How a piece of work stands: what was asked, how far it is, and the last good result with its name.

Knows no thread and no widget. Whoever computes holds a ticket; what comes back with a ticket that nobody
waits for any more changes nothing.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from enum import Enum
from typing import Any

import traitlets

from workbench.widgets.jobs.progress import Progress


class Stage(Enum):
    """Where a piece of work is."""

    IDLE = "nothing was asked yet"
    COMPUTING = "computing"
    DONE = "the result is there"
    CANCELLED = "cancelled before there was a result"
    FAILED = "could not be computed"


@dataclass(frozen=True, slots=True, eq=False)  # each standing is one of a kind: results may be arrays
class Standing:
    """How a piece of work stands at one moment.

    Attributes:
        stage: where it is.
        asked: the name of what was asked last.
        shown: the name of what the result is of.
        result: the last good result; None before the first.
        progress: how far it is, while computing.
        why: what went wrong, if it failed.
    """

    stage: Stage = Stage.IDLE
    asked: str = ""
    shown: str = ""
    result: Any = None
    progress: Progress | None = None
    why: str = ""

    @property
    def is_stale(self) -> bool:
        """Say whether the result is not, or not yet, of what was asked last."""
        return self.result is not None and self.stage is not Stage.DONE

    @property
    def caption(self) -> str:
        """Return what must stand beside a stale result: what it is of; else nothing."""
        return f"Still shown: {self.shown}" if self.is_stale else ""

    def text(self) -> str:
        """Return the line that tells how the work stands."""
        match self.stage:
            case Stage.IDLE:
                return ""
            case Stage.COMPUTING:
                far = f", {self.progress.text()}" if self.progress else ""
                return f"Computing {self.asked}{far}"
            case Stage.DONE:
                return f"Shown: {self.shown}"
            case Stage.CANCELLED:
                return f"Cancelled: {self.asked}"
            case Stage.FAILED:
                return f"Could not compute {self.asked}: {self.why}"


class Work(traitlets.HasTraits):
    """One piece of work that may be asked for again and again; changed on the home thread only."""

    standing = traitlets.Instance(Standing, ())

    def __init__(self) -> None:
        super().__init__()
        self._newest = 0  # ticket handed out last
        self._shown = 0  # ticket of the result
        self._dropped = 0  # tickets up to this one were cancelled

    def ask(self, name: str) -> int:
        """Note that something is asked for, in place of what was asked before.

        Args:
            name: what it is, in the user's words.

        Returns:
            The ticket that its result must bring.
        """
        self._newest += 1
        self.standing = replace(self.standing, stage=Stage.COMPUTING, asked=name, progress=None, why="")
        return self._newest

    def is_wanted(self, ticket: int) -> bool:
        """Say whether this is what was asked last, and still awaited; from any thread."""
        return ticket == self._newest and ticket > self._dropped

    def advance(self, ticket: int, progress: Progress) -> None:
        """Note how far it is."""
        if self._is_computing(ticket):
            self.standing = replace(self.standing, progress=progress)

    def finish(self, ticket: int, name: str, result: Any, *, on_the_way: bool = False) -> bool:
        """Take a result, unless nobody waits for it.

        Args:
            ticket: what `ask` returned.
            name: what the result is of.
            result: anything but None.
            on_the_way: also take a result that a newer request has overtaken, if it is newer than what is
                shown; a slider that moves without a pause would show nothing otherwise.

        Returns:
            True if it was taken.
        """
        if ticket <= max(self._shown, self._dropped):
            return False
        if self._is_computing(ticket):
            self._shown = ticket
            self.standing = Standing(Stage.DONE, name, name, result)
            return True
        if on_the_way and self.standing.stage is Stage.COMPUTING:
            self._shown = ticket
            self.standing = replace(self.standing, shown=name, result=result)
            return True
        return False

    def fail(self, ticket: int, why: str) -> None:
        """Note that it could not be computed; the last good result stays."""
        if self._is_computing(ticket):
            self.standing = replace(self.standing, stage=Stage.FAILED, progress=None, why=why)

    def cancel(self) -> None:
        """Wait for nothing any more; the last good result stays."""
        self._dropped = self._newest
        if self.standing.stage is Stage.COMPUTING:
            self.standing = replace(self.standing, stage=Stage.CANCELLED, progress=None)

    def forget(self) -> None:
        """Wait for nothing and show nothing: what the work is about is there no longer."""
        self._dropped = self._newest
        self.standing = Standing()

    def _is_computing(self, ticket: int) -> bool:
        return self.is_wanted(ticket) and self.standing.stage is Stage.COMPUTING
