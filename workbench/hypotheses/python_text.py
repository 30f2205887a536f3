"""Python literals and calls as text, laid out as one would type them."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

WIDTH = 100
STEP = "    "
ESCAPES = {"\\": "\\\\", '"': '\\"', "\n": "\\n", "\t": "\\t", "\r": "\\r"}


@dataclass(frozen=True, slots=True)
class Brackets:
    """What stands between two brackets, separated by commas.

    Attributes:
        start: all up to the opening bracket, it included.
        items: what is listed.
        end: the closing bracket.
        is_filled: put as many on a line as fit, not one.
    """

    start: str
    items: tuple[Piece, ...]
    end: str
    is_filled: bool = False


Piece = str | Brackets


def prefixed(prefix: str, piece: Piece) -> Piece:
    """Return a piece with a text before it, such as the name of an argument."""
    if isinstance(piece, str):
        return prefix + piece
    return Brackets(prefix + piece.start, piece.items, piece.end, piece.is_filled)


def tuple_of(items: Sequence[Piece]) -> Piece:
    """Return a tuple; one of a single item keeps its comma."""
    if len(items) == 1:
        return Brackets("(", tuple(items), ",)")
    return Brackets("(", tuple(items), ")")


def number_text(number: float) -> str:
    """Return a number with all its digits; whole ones stay whole."""
    return str(number) if type(number) is int else repr(float(number))


def string_text(text: str) -> str:
    """Return a text in double quotes that Python reads back as it is, whatever it holds.

    Everything that cannot be seen, or that changes the direction of what is written, is spelt out.
    """
    return '"' + "".join(map(_letter, text)) + '"'


def laid_out(piece: Piece, width: int = WIDTH) -> str:
    """Return a piece as lines: on one where it fits, else what is listed on lines of its own.

    Args:
        piece: what to write.
        width: the longest line wanted [letters]; texts are never cut.
    """
    return "\n".join(_lines(piece, "", width))


def _letter(letter: str) -> str:
    if letter in ESCAPES or letter.isprintable():
        return ESCAPES.get(letter, letter)
    code = ord(letter)
    return f"\\u{code:04x}" if code < 0x10000 else f"\\U{code:08x}"


def _flat(piece: Piece) -> str:
    if isinstance(piece, str):
        return piece
    return piece.start + ", ".join(map(_flat, piece.items)) + piece.end


def _lines(piece: Piece, indent: str, width: int) -> Iterator[str]:
    """Yield the lines of a piece; room is left for a comma after its end."""
    flat = indent + _flat(piece)
    if isinstance(piece, str) or not piece.items or len(flat) < width:
        yield flat
        return
    yield indent + piece.start
    if piece.is_filled:
        yield from _filled(piece.items, indent + STEP, width)
    else:
        for item in piece.items:
            *before, last = _lines(item, indent + STEP, width)
            yield from before
            yield f"{last},"
    yield indent + piece.end.lstrip(",")


def _filled(items: Sequence[Piece], indent: str, width: int) -> Iterator[str]:
    line = indent
    for item in map(_flat, items):
        if line != indent and len(line) + len(item) + 2 > width:
            yield line.rstrip()
            line = indent
        line += f"{item}, "
    yield line.rstrip()
