"""Plain tables as TOML text, laid out as one would type an analysis file."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import cast

from workbench.hypotheses.contents import LEFT_OUT, Content
from workbench.hypotheses.faults import BARE_KEY

NESTED = ("regions", "alternatives")
ESCAPES = {'"': '\\"', "\\": "\\\\", "\n": "\\n", "\t": "\\t", "\r": "\\r"}


def file_text(content: Content) -> str:
    """Return a whole analysis file; keys that say what their absence says are left out.

    Args:
        content: the tables of an analysis, as `content_of` gives them, with each region's bins.

    Returns:
        TOML.

    Source:
        none, definition
    """
    lines = [f"{key} = {value_text(content[key])}" for key in ("format", "title")]
    if "exposure" in content:
        lines += ["", *table_lines(("exposure",), _table(content["exposure"]))]
    for kind in ("regions", "parameters", "processes", "uncertainties", "hypotheses"):
        named = _table(content.get(kind, {}))
        lines += [""] if named else []
        for name, inner in named.items():
            lines += table_lines((kind, name), _table(inner))
    return "\n".join(lines) + "\n"


def table_lines(path: tuple[str, ...], table: Content) -> list[str]:
    """Return a table with its header: numbers and texts first, a process' regions and alternatives apart.

    Args:
        path: the table's key path.
        table: its keys.

    Returns:
        Lines of TOML.
    """
    lines = ["[" + ".".join(key_text(step) for step in path) + "]"]
    inner: list[str] = []
    for key, value in table.items():
        if is_left_out(key, value):
            continue
        if key in NESTED and isinstance(value, Mapping):
            for name, one in value.items():
                inner += table_lines((*path, key, name), _table(one))
        elif key == "effects" and isinstance(value, Mapping):
            lines += [f"effects.{key_text(name)} = {value_text(one)}" for name, one in value.items()]
        else:
            lines.append(f"{key_text(key)} = {value_text(value)}")
    return lines + inner


def is_left_out(key: str, value: object) -> bool:
    """Tell whether a key says what its absence would say."""
    return key in LEFT_OUT and value == LEFT_OUT[key]


def key_text(key: str) -> str:
    """Return a key, in quotes where it needs them."""
    return key if BARE_KEY.fullmatch(key) else string_text(key)


def value_text(value: object) -> str:
    """Return a value on one line.

    Args:
        value: a text, number, truth, list or table.

    Returns:
        TOML; floats with all their digits.

    Source:
        none; the TOML 1.0 grammar of values.
    """
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, str):
        return string_text(value)
    if isinstance(value, int):
        return str(value)
    if isinstance(value, float):
        is_whole = value.is_integer() and abs(value) < 1e15
        return str(int(value)) if is_whole and str(value) != "-0.0" else repr(value)
    if isinstance(value, Mapping):
        return "{ " + ", ".join(_pairs(value)) + " }" if value else "{}"
    return "[" + ", ".join(value_text(one) for one in cast("list[object]", value)) + "]"


def string_text(text: str) -> str:
    """Return a text in double quotes, escaped where TOML asks for it."""
    return (
        '"' + "".join(ESCAPES.get(one, one if _is_plain(one) else f"\\u{ord(one):04X}") for one in text) + '"'
    )


def _pairs(table: Mapping[str, object]) -> Iterator[str]:
    for key, value in table.items():
        yield f"{key_text(key)} = {value_text(value)}"


def _is_plain(letter: str) -> bool:
    return letter >= " " and letter != "\x7f"


def _table(value: object) -> Content:
    return cast("Content", value)
