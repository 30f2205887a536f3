"""What goes to the terminal: text that every encoding can show, progress, warnings."""

from __future__ import annotations

import sys
from collections.abc import Iterable
from typing import Self, TextIO

from workbench.errors import Caution


def can_show(text: str, stream: TextIO) -> bool:
    """Tell whether a stream's encoding has every character of a text."""
    try:
        text.encode(stream.encoding or "utf-8")
    except (UnicodeEncodeError, LookupError):
        return False
    return True


def print_text(text: str, stream: TextIO) -> None:
    """Write a text, in ASCII where the stream's encoding can show no more."""
    if not can_show(text, stream):
        from workbench.records.screens.layout import plain_ascii

        text = plain_ascii(text)
    stream.write(text)


def warn(cautions: Iterable[Caution]) -> None:
    """Write warnings to standard error, one a line."""
    for caution in cautions:
        print_text(f"warning: {caution.text}\n", sys.stderr)


class Progress:
    """One line on standard error that says what is being done; silent unless that is a terminal."""

    def __init__(self, stream: TextIO | None = None) -> None:
        self._stream = sys.stderr if stream is None else stream
        self._is_shown = self._stream.isatty()

    def __enter__(self) -> Self:
        return self

    def __exit__(self, *ending: object) -> None:
        self._write("")

    def say(self, text: str) -> None:
        """Replace the line."""
        self._write(f"{text[:76]} ...")

    def _write(self, text: str) -> None:
        if self._is_shown:
            print_text("\r\x1b[K" + text, self._stream)
            self._stream.flush()
