"""Puts new content into an existing TOML document; what has not changed keeps its words and comments."""

from __future__ import annotations

from collections.abc import Mapping, MutableMapping
from typing import Any, cast

import tomlkit
from tomlkit.items import InlineTable

from workbench.hypotheses.contents import Content
from workbench.hypotheses.file.toml_text import NESTED, is_left_out, table_lines, value_text

ORDERED = ("regions", "parameters", "processes", "uncertainties", "hypotheses")


def merged_text(original: str, content: Content) -> str:
    """Return the original text with the content in it.

    Args:
        original: a TOML text.
        content: the tables that it shall hold.

    Returns:
        TOML; comments and order are the original's wherever the content stays.

    Source:
        none, definition
    """
    document = tomlkit.parse(original)
    _merge(cast("MutableMapping[str, Any]", document), content, ())
    for kind in ORDERED:
        names = list(cast("Content", content.get(kind, {})))
        if kind in document and list(cast("Mapping[str, Any]", document[kind])) != names:
            _reorder(cast("MutableMapping[str, Any]", document), kind, names)
    return tomlkit.dumps(document)


def _merge(target: MutableMapping[str, Any], content: Content, path: tuple[str, ...]) -> None:
    for key in list(target):
        if key not in content:
            del target[key]
    for key, value in content.items():
        if key in target:
            old = target[key]
            is_another = (
                isinstance(old, InlineTable) and isinstance(value, Mapping) and not old.keys() & value.keys()
            )
            if isinstance(old, MutableMapping) and isinstance(value, Mapping) and value and not is_another:
                _merge(old, cast("Content", value), (*path, key))
                if _is_ordered((*path, key)) and list(old) != list(value):
                    _put_in_order(old, list(value))
            elif _is_nothing(key, value):
                del target[key]
            elif not _is_same(old, value):
                target[key] = _inline(value)
        elif not is_left_out(key, value):
            target[key] = _added(target, (*path, key), value)


def _is_nothing(key: str, value: object) -> bool:
    """Tell whether a key would hold an empty list or table that need not be there."""
    return isinstance(value, list | Mapping) and not value and is_left_out(key, value)


def _is_ordered(path: tuple[str, ...]) -> bool:
    """Tell whether the order in a table is part of what it says: a source's effects, and their regions."""
    return path[0] == "uncertainties" and path[2::2] in {("effects",), ("effects", "regions")}


def _put_in_order(table: MutableMapping[str, Any], names: list[str]) -> None:
    """Put the keys of a table into the given order; each keeps the comment on its line."""
    kept = {name: table[name] for name in names if name in table}
    for name in kept:
        del table[name]
    for name, item in kept.items():
        table[name] = item


def _is_same(old: object, value: object) -> bool:
    """Tell whether a value of the document says the same: 1200 and 1200.0 do, 1 and true don't."""
    plain = old.unwrap() if hasattr(old, "unwrap") else old
    if isinstance(plain, list) and isinstance(value, list):
        return len(plain) == len(value) and all(map(_is_same, plain, value))
    if isinstance(plain, Mapping) and isinstance(value, Mapping):
        return plain.keys() == value.keys() and all(_is_same(plain[key], value[key]) for key in plain)
    return isinstance(plain, bool) == isinstance(value, bool) and plain == value


def _inline(value: object) -> Any:
    return tomlkit.value(value_text(value))


def _added(target: MutableMapping[str, Any], path: tuple[str, ...], value: object) -> Any:
    """Return what is set under a new key: a table of its own where the file would have one, else a value."""
    is_table = isinstance(value, Mapping) and (len(path) == 1 or path[-2] in {*ORDERED, *NESTED})
    if not is_table or isinstance(target, InlineTable):
        return _inline(value)
    fragment = tomlkit.parse("\n".join(_fragment_lines(path, cast("Content", value))))
    found: Any = fragment
    for step in path:
        found = found[step]
    return found


def _fragment_lines(path: tuple[str, ...], value: Content) -> list[str]:
    if path in {(kind,) for kind in ORDERED}:
        return [
            line
            for name, inner in value.items()
            for line in table_lines((*path, name), cast("Content", inner))
        ]
    return table_lines(path, value)


def _reorder(document: MutableMapping[str, Any], kind: str, names: list[str]) -> None:
    """Put the named tables of one kind into the given order; each keeps its own lines."""
    old = document[kind]
    kept = {name: old[name] for name in names}
    del document[kind]
    holder = tomlkit.table(is_super_table=True)
    for name in names:
        holder[name] = kept[name]
    document[kind] = holder
