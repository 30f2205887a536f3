"""Records on disk: whole or not at all, JSON that every reader takes, and read back."""

from __future__ import annotations

import json
import re
from pathlib import Path
from typing import Any

import pytest

from tests.records import hand_built as hand
from workbench.errors import InputError
from workbench.records.check_record import check_record
from workbench.records.files import read_record, record_text, write_record
from workbench.records.fit_record import fit_record
from workbench.records.weigh_record import weigh_record

RECORDS = {
    "weigh": lambda: weigh_record(hand.weighed()),
    "check": lambda: check_record(hand.checked()),
    "fit": lambda: fit_record(hand.fitted()),
}


def refuse_constant(name: str) -> None:
    raise AssertionError(f"{name} is no JSON")


@pytest.mark.parametrize("command", RECORDS)
def test_a_record_read_back_is_the_record(command: str, tmp_path: Path) -> None:
    path = tmp_path / "record.json"
    record = RECORDS[command]()
    write_record(record, path)
    found = read_record(path)
    assert found["command"] == command
    assert found == json.loads(record_text(record), parse_constant=refuse_constant)


def test_infinity_and_nan_become_null() -> None:
    text = record_text({"a": float("inf"), "b": [float("nan"), 1.5], "c": {"d": -float("inf")}})
    assert json.loads(text, parse_constant=refuse_constant) == {"a": None, "b": [None, 1.5], "c": {"d": None}}


def test_a_failed_writing_leaves_the_old_record(tmp_path: Path) -> None:
    path = tmp_path / "record.json"
    write_record(RECORDS["fit"](), path)
    before = path.read_text(encoding="utf-8")
    with pytest.raises(TypeError):
        write_record({"format": object()}, path)
    assert path.read_text(encoding="utf-8") == before
    assert [entry.name for entry in tmp_path.iterdir()] == ["record.json"]


def test_only_ascii_is_still_the_same_record() -> None:
    record = {"title": "Übergang ± 1"}
    text = record_text(record, only_ascii=True)
    assert text.isascii()
    assert json.loads(text) == record


@pytest.mark.parametrize(
    ("content", "found"),
    [
        ("{", "expecting property name enclosed in double quotes"),
        ("[1, 2]", "JSON without a key format"),
        ('{"command": "fit"}', "JSON without a key format"),
        ('{"format": 2, "command": "fit"}', "2"),
        ('{"format": true, "command": "fit"}', "True"),
        ('{"format": 1, "command": "guess"}', '"guess"'),
        ("[" * 100_000, "recursion"),
    ],
)
def test_what_is_no_record_is_refused_with_a_reason(content: str, found: str, tmp_path: Path) -> None:
    path = tmp_path / "record.json"
    path.write_text(content, encoding="utf-8")
    with pytest.raises(InputError) as refusal:
        read_record(path)
    (problem,) = refusal.value.problems
    assert re.search(re.escape(found), problem.found, re.IGNORECASE)
    assert "record.json" in problem.where


def test_a_missing_record_is_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="no such file"):
        read_record(tmp_path / "nothing.json")


def plain(value: Any) -> bool:
    """Say whether a value is made of JSON's own kinds."""
    if isinstance(value, dict):
        return all(isinstance(key, str) and plain(item) for key, item in value.items())
    if isinstance(value, list):
        return all(plain(item) for item in value)
    return value is None or type(value) in {str, int, float, bool}


@pytest.mark.parametrize("command", RECORDS)
def test_a_record_holds_nothing_but_what_json_knows(command: str) -> None:
    assert plain(RECORDS[command]())
