"""The list of published values itself."""

from __future__ import annotations

import importlib
from pathlib import Path

from tests.published.printed import TAKEN, every_value


def test_every_published_value_is_tested() -> None:
    for path in sorted(Path(__file__).parent.glob("test_*.py")):
        importlib.import_module(f"tests.published.{path.stem}")
    assert {value.name for value in every_value()} == TAKEN


def test_every_published_value_says_where_it_comes_from() -> None:
    values = every_value()
    assert len({value.name for value in values}) == len(values)
    for value in values:
        assert value.source.strip(", "), value.name
        assert value.known_by, value.name
        assert value.precision > 0.0, value.name
