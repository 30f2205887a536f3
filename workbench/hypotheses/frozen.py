"""A mapping that cannot be changed, that compares by content and travels to worker processes."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import TypeVar

Value = TypeVar("Value")


class FrozenMapping(Mapping[str, Value]):
    """A copy of a mapping, kept in its order and locked.

    A proxy from the standard library would be locked too, but cannot be sent to another process.
    """

    __slots__ = ("_content",)

    def __init__(self, content: Mapping[str, Value]) -> None:
        self._content = dict(content)

    def __getitem__(self, key: str) -> Value:
        return self._content[key]

    def __iter__(self) -> Iterator[str]:
        return iter(self._content)

    def __len__(self) -> int:
        return len(self._content)

    def __hash__(self) -> int:
        return hash(frozenset(self._content.items()))

    def __repr__(self) -> str:
        return repr(self._content)
