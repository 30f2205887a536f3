"""What went wrong or was printed inside the bench: JupyterLab shows that to nobody, so the bench keeps it."""

from __future__ import annotations

import traceback
from dataclasses import dataclass
from enum import Enum

import traitlets

from workbench.errors import InputError

MOST_KEPT = 20


class Kind(Enum):
    """What a notice is about; the value is how its line begins."""

    PROBLEM = "A problem in the input"
    FAULT = "A fault of oddsbench, not of your input"
    PRINTED = "Printed while the bench worked"


@dataclass(frozen=True, slots=True)
class Notice:
    """One thing that the user must be able to see.

    Attributes:
        kind: what it is about.
        text: what happened.
        details: what to send with a fault, else empty.
    """

    kind: Kind
    text: str
    details: str = ""


class Notices(traitlets.HasTraits):
    """The notices that nobody has dismissed yet, oldest first; the latest `MOST_KEPT` of them."""

    shown = traitlets.Tuple()

    def add(self, notice: Notice) -> None:
        """Show one notice more, once however often it comes in a row."""
        if not self.shown or self.shown[-1] != notice:
            self.shown = (*self.shown, notice)[-MOST_KEPT:]

    def add_error(self, error: BaseException) -> None:
        """Show an exception: the problems of an input as they are, anything else as a fault of ours."""
        if isinstance(error, InputError):
            self.add(Notice(Kind.PROBLEM, str(error)))
        else:
            words = f"{type(error).__name__}: {error}".strip().rstrip(":")
            self.add(Notice(Kind.FAULT, words, "".join(traceback.format_exception(error))))

    def add_printed(self, text: str) -> None:
        """Show what was printed, unless that was nothing."""
        if text.strip():
            self.add(Notice(Kind.PRINTED, text.strip()))

    def dismiss(self) -> None:
        """Show nothing any more."""
        self.shown = ()
