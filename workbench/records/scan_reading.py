"""A saved scan read back: the record of `scan`, whole and unchanged, or it is refused."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt

from workbench.errors import InputError, Problem, quoted
from workbench.evidence.ratio.panels import Panels
from workbench.evidence.ratio.results import Check, Scan
from workbench.evidence.ratio.strengths import Strengths
from workbench.evidence.ratio.surface import Surface
from workbench.hypotheses.priors import FAMILIES, Prior
from workbench.records.files import read_record
from workbench.records.scan_record import digest_of_scan

Array = npt.NDArray[np.float64]

_AGAIN = "oddsbench scan FILE --output scan.json"


@dataclass(frozen=True, slots=True, eq=False)
class SavedScan:
    """A scan as a record holds it.

    Attributes:
        name: the record's file as the user gave it.
        title: the analysis' title.
        file: the analysis file that it was made from.
        digest: the record's own.
        scan: the updating ratio.
    """

    name: str
    title: str
    file: str
    digest: str
    scan: Scan


def read_scan(path: str | Path) -> Scan:
    """Read the updating ratio that `oddsbench scan --output FILE.json` keeps.

    Args:
        path: the record.

    Returns:
        The scan, whose `reprior` makes a Bayes factor under any prior of what was scanned.

    Raises:
        InputError: if the file is no record of a scan, or was changed after it was written.

    Source:
        None, definition.
    """
    return read_saved_scan(path).scan


def read_saved_scan(path: str | Path) -> SavedScan:
    """Read a saved scan with what its record says of it.

    Args:
        path: the record.

    Raises:
        InputError: if the file is no record of a scan, or was changed after it was written.
    """
    shown = str(path)
    record = read_record(path)
    if record["command"] != "scan":
        raise InputError(
            Problem(
                "A record of another kind",
                shown,
                f"a record of {quoted(str(record['command']))}",
                'a record of "scan"',
                _AGAIN,
            )
        )
    try:
        is_whole = record["digest"] == digest_of_scan(record)
        found = _saved(record, shown) if is_whole else None
    except (KeyError, TypeError, ValueError, AttributeError, OverflowError, InputError) as error:
        raise InputError(
            Problem(
                "A record of a scan that can't be understood",
                shown,
                f"{type(error).__name__.lower().removesuffix('error') or 'an'} fault in its keys",
                "the keys that oddsbench scan writes",
                _AGAIN,
            )
        ) from error
    if found is None:
        raise InputError(
            Problem(
                "A record that was changed after it was written",
                f"{shown}, key digest",
                "content of another digest",
                str(record["digest"]),
                f"take the file as it was written, or {_AGAIN}",
            )
        )
    return found


def _saved(record: Mapping[str, Any], shown: str) -> SavedScan:
    priors = {**record["priors"], **record["averaged"]}
    surface = None if record["surface"] is None else _surface(record["surface"])
    over = tuple(str(name) for name in record["over"])
    if surface is not None and set(surface.names) != set(over):
        raise ValueError("another surface than over")
    found = Scan(
        str(record["hypothesis"]),
        str(record["against"]),
        over,
        surface,
        {name: _prior(record["priors"][name]) for name in over},
        {name: _prior(entry) for name, entry in record["averaged"].items()},
        {name: str(entry["unit"]) for name, entry in priors.items()},
        float(record["prior_odds"]),
        bool(record["is_one_without_signal"]),
        _number(record["ln_bayes_factor"]),
        _number(record["ln_bayes_factor_error"]),
        bool(record["established"]),
        str(record["reason"] or ""),
        int(record["seed"]),
        int(record["draws"]),
        tuple(Check(**check) for check in record["checks"]),
    )
    origin = record["inputs"]
    return SavedScan(shown, str(record["title"]), str(origin["file"]), str(record["digest"]), found)


def _number(value: Any) -> float | None:
    return None if value is None else float(value)


def _prior(entry: Mapping[str, Any]) -> Prior:
    ((family, numbers),) = entry["prior"].items()
    return FAMILIES[family](**numbers)


def _surface(entry: Mapping[str, Any]) -> Surface:
    panels = tuple(
        Panels(str(one["name"]), str(one["unit"]), _ascending(one["edges"])) for one in entry["panels"]
    )
    ln_ratio, error = _table(entry["ln_ratio"]), _table(entry["error"])
    columns = int(np.prod([one.nodes.size for one in panels]))
    strengths = None if entry["strengths"] is None else _strengths(entry["strengths"], columns)
    nodes = 1 if strengths is None else strengths.number
    if ln_ratio.shape != (columns, nodes) or error.shape != ln_ratio.shape or (error < 0.0).any():
        raise ValueError("tables of another shape")
    return Surface(panels, strengths, ln_ratio, error)


def _strengths(entry: Mapping[str, Any], columns: int) -> Strengths:
    nodes = _table(entry["nodes"])
    offset, centre, scale = (_row(entry[key], columns) for key in ("offset", "centre", "scale"))
    if len(nodes) != columns or nodes.shape[1] < 6 or not (scale > 0.0).all():
        raise ValueError("strength nodes of another shape")
    low, high = float(entry["low"]), float(entry["high"])
    return Strengths(str(entry["name"]), low, high, offset, centre, scale, nodes.shape[1], nodes)


def _row(values: Any, size: int) -> Array:
    found = np.asarray(values, dtype=float)
    if found.shape != (size,) or not np.isfinite(found).all():
        raise ValueError("a row of another shape")
    return found


def _ascending(values: Any) -> Array:
    found = _row(values, len(values))
    if found.size < 2 or not (np.diff(found) > 0.0).all():
        raise ValueError("edges that do not ascend")
    return found


def _table(values: Any) -> Array:
    found = np.asarray(values, dtype=float)
    if found.ndim != 2 or not np.isfinite(found).all():
        raise ValueError("a table with gaps")
    return found
