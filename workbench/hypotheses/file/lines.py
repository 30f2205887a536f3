"""On which line of a TOML text each key stands.

The standard library's reader gives values without their lines. This scan trusts that the text has been read
without an error, so it needs to know only where strings, comments and brackets begin and end.
"""

from __future__ import annotations

import re
import tomllib

from workbench.hypotheses.faults import KeyPath

# Longest first: a triple quote is not an empty string followed by a quote.
TOKEN = re.compile(
    r"""(?P<text>\"{3}(?:[^\\]|\\.)*?\"{3,5}|'{3}.*?'{3,5}|"(?:[^"\\\n]|\\.)*"|'[^'\n]*')"""
    r"""|(?P<comment>\#[^\n]*)|(?P<line>\n)|(?P<open>[\[{])|(?P<close>[\]}])|(?P<equals>=)"""
    r"""|(?P<dot>\.)|(?P<word>[A-Za-z0-9_-]+)|(?P<other>.)""",
    re.DOTALL,
)


def key_lines(text: str) -> dict[KeyPath, int]:
    """Return the line, counted from 1, of every table header and key outside inline tables.

    Args:
        text: a TOML text that has been read without an error.

    Returns:
        Key path to line; parents named only by their children have the first child's line.

    Source:
        None; the TOML 1.0 grammar of keys.
    """
    found: dict[KeyPath, int] = {}
    header: KeyPath = ()
    parts: list[str] = []
    line, depth, in_value = 1, 0, False
    for token in TOKEN.finditer(text.replace("\r\n", "\n")):
        kind, piece = token.lastgroup, token.group()
        if kind == "line":
            if depth == 0:
                parts, in_value = [], False
        elif kind == "open":
            depth += 1
        elif kind == "close":
            depth -= 1
            if depth == 0 and not in_value and parts:
                header = tuple(parts)
                _note(found, header, line)
                in_value = True
        elif kind == "equals" and depth == 0 and not in_value:
            _note(found, header + tuple(parts), line)
            in_value = True
        elif kind in {"text", "word"} and not in_value:
            parts.append(_key(piece))
        line += piece.count("\n")
    return found


def line_of(path: KeyPath, lines: dict[KeyPath, int]) -> int | None:
    """Return the line of a key, or of the nearest parent that has one."""
    for length in range(len(path), 0, -1):
        line = lines.get(path[:length])
        if line is not None:
            return line
    return None


def _note(found: dict[KeyPath, int], path: KeyPath, line: int) -> None:
    for length in range(1, len(path)):
        found.setdefault(path[:length], line)
    found.setdefault(path, line)


def _key(piece: str) -> str:
    """Return the key that a bare or quoted piece writes."""
    if piece[0] not in "\"'":
        return piece
    try:
        return str(tomllib.loads(f"x = {piece}")["x"])
    except tomllib.TOMLDecodeError:
        return piece
