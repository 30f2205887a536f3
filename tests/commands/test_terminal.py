"""What reaches the terminal: every encoding gets something it can show, progress only where someone looks."""

from __future__ import annotations

import io

from workbench.commands.terminal import Progress, can_show, print_text


class Terminal(io.StringIO):
    """A text stream that says it is a terminal."""

    def isatty(self) -> bool:
        return True


def encoded(text: str, encoding: str) -> bytes:
    """Return what is written to a stream of some encoding."""
    raw = io.BytesIO()
    stream = io.TextIOWrapper(raw, encoding=encoding)
    print_text(text, stream)
    stream.flush()
    return raw.getvalue()


def test_an_ascii_terminal_gets_ascii() -> None:
    assert encoded("−7.7 ± 0.1 · 10 × 3 – ═", "ascii") == b"-7.7 +/- 0.1 - 10 x 3 - ="
    assert encoded("−7.7 ± 0.1", "latin-1") == b"-7.7 +/- 0.1"


def test_a_terminal_that_can_show_everything_gets_it() -> None:
    assert encoded("−7.7 ± 0.1", "utf-8") == "−7.7 ± 0.1".encode()
    assert can_show("±", io.StringIO())


def test_progress_is_said_on_a_terminal_and_taken_away() -> None:
    stream = Terminal()
    with Progress(stream) as progress:
        progress.say("fitting resonance")
    assert stream.getvalue() == "\r\x1b[Kfitting resonance ...\r\x1b[K"


def test_progress_is_silent_where_nobody_looks() -> None:
    stream = io.StringIO()
    with Progress(stream) as progress:
        progress.say("fitting resonance")
    assert stream.getvalue() == ""
