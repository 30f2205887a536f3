"""Records as JSON: written whole or not at all, without infinities, and read back."""

from __future__ import annotations

import json
import math
import re
from collections.abc import Mapping
from pathlib import Path
from typing import Any

from workbench.counts.files import read_bytes, text_of, write_text_atomically
from workbench.errors import InputError, Problem

FORMAT = 1
_ROW = re.compile(r"\[\n(?:\s*(?:-?\d[\d.eE+-]*|null),?\n)+\s*\]")  # numbers, one a line: put on one line
COMMANDS = ("weigh", "check", "fit", "scan", "reprior", "backgrounds", "breakpoint", "ledger", "priors")


def record_text(record: Mapping[str, Any], *, only_ascii: bool = False) -> str:
    """Return a record as JSON text; numbers that JSON has no word for (infinity, nan) become null.

    Args:
        record: what `weigh_record`, `check_record` or `fit_record` made.
        only_ascii: True to escape every other character, for a terminal that can't show it.
    """
    text = json.dumps(_finite(record), indent=1, ensure_ascii=only_ascii, allow_nan=False)
    return _ROW.sub(lambda row: " ".join(row[0].split()).replace("[ ", "[").replace(" ]", "]"), text) + "\n"


def write_record(record: Mapping[str, Any], path: str | Path) -> None:
    """Write a record whole or not at all.

    Args:
        record: what `weigh_record`, `check_record` or `fit_record` made.
        path: the file; an existing one is replaced.

    Raises:
        InputError: if the file can't be written.
    """
    write_text_atomically(Path(path), record_text(record))


def read_record(path: str | Path) -> dict[str, Any]:
    """Read a record back.

    Args:
        path: the file.

    Returns:
        The record as it was written.

    Raises:
        InputError: if it can't be read, is no JSON, or is no record of a format known here.
    """
    shown = str(path)
    text = text_of(read_bytes(Path(path), shown), shown)
    try:
        record = json.loads(text)
    except (ValueError, RecursionError) as error:
        raise InputError(_not_json(shown, error)) from error
    problem = _stranger(record, shown)
    if problem is not None:
        raise InputError(problem)
    found: dict[str, Any] = record
    return found


def _finite(value: Any) -> Any:
    if isinstance(value, Mapping):
        return {str(key): _finite(item) for key, item in value.items()}
    if isinstance(value, list | tuple):
        return [_finite(item) for item in value]
    if isinstance(value, float):
        return float(value) if math.isfinite(value) else None
    return value


def _not_json(shown: str, error: ValueError | RecursionError) -> Problem:
    if isinstance(error, json.JSONDecodeError):
        return Problem(
            "Record can't be understood",
            f"{shown}, line {error.lineno}, column {error.colno}",
            error.msg.lower(),
            "JSON, as --json and --output write it",
            "make the record again",
        )
    return Problem("Record can't be understood", shown, str(error), "JSON", "make the record again")


def _stranger(record: object, shown: str) -> Problem | None:
    if not isinstance(record, dict) or "format" not in record:
        return Problem(
            "Not a record",
            shown,
            "JSON without a key format",
            "a record of " + ", ".join(COMMANDS),
            "name a file that --output wrote",
        )
    if record["format"] != FORMAT or isinstance(record["format"], bool):
        return Problem(
            "Record of another format",
            f"{shown}, key format",
            json.dumps(record["format"]),
            str(FORMAT),
            "read it with the version of oddsbench that wrote it (key versions)",
        )
    if record.get("command") not in COMMANDS:
        return Problem(
            "Record of an unknown command",
            f"{shown}, key command",
            json.dumps(record.get("command")),
            "one of " + ", ".join(COMMANDS),
            "name a record of one of these commands",
        )
    return None
