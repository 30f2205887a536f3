"""How a region's bins are written: as the file they came from, in the analysis file, or as a new CSV file."""

from __future__ import annotations

import os
import re
from collections.abc import Iterator
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np

from workbench.counts.csv_writing import csv_text
from workbench.counts.region import Region
from workbench.errors import InputError
from workbench.hypotheses.contents import Content, numbers_digest
from workbench.hypotheses.file.regions import read_table_beside


@dataclass(frozen=True, slots=True)
class Bins:
    """A region's bins as keys of the analysis file, and a CSV file to write beside it, if any.

    Attributes:
        keys: `table`, or `edges` and `observed`.
        path: the CSV file to write; None for none.
        text: what it shall hold.
    """

    keys: Content
    path: Path | None = None
    text: str = ""


def bins_of(region: Region, path: Path, mentioned: str | None, taken: set[str]) -> Bins:
    """Return how to write a region's bins so that they are read back as they are.

    Args:
        region: the region.
        path: the analysis file that is written.
        mentioned: the table that an earlier version of the file names, if any.
        taken: names of new CSV files already promised to other regions.

    Returns:
        Keys, and a CSV file that is needed.

    Source:
        none, definition
    """
    for name in _candidates(region, path.parent, mentioned):
        if holds_region(name, path.parent, region):
            return Bins({"table": name})
    table = region.table
    if not table.columns and np.array_equal(table.binning.low[1:], table.binning.high[:-1]):
        keys: Content = {"edges": [*map(float, table.binning.low), table.binning.last]}
        if table.observed is not None:
            keys["observed"] = [float(count) for count in table.observed]
        return Bins(keys)
    for name in _new_names(region, path):
        if holds_region(name, path.parent, region):
            return Bins({"table": name})
        if name not in taken and not (path.parent / name).exists():
            taken.add(name)
            return Bins({"table": name}, path.parent / name, csv_text(table))
    raise AssertionError("there is always a next name")


def _candidates(region: Region, folder: Path, mentioned: str | None) -> Iterator[str]:
    if mentioned is not None:
        yield mentioned
    source = region.table.source
    yield source
    try:
        if Path(source).is_file():
            name = Path(os.path.relpath(source, folder)).as_posix()
            if not name.startswith("../.."):  # a path across half the disk breaks when either end moves
                yield name
    except (OSError, ValueError):  # a description rather than a file, or a file on another drive
        return


def _new_names(region: Region, path: Path) -> Iterator[str]:
    stem = f"{path.stem}-{re.sub(r'[^A-Za-z0-9_.-]+', '-', region.name).strip('-.') or 'region'}"
    yield f"{stem}.csv"
    number = 2
    while True:
        yield f"{stem}-{number}.csv"
        number += 1


def holds_region(name: str, folder: Path, region: Region) -> bool:
    """Tell whether a table beside an analysis file gives exactly a region's numbers.

    Args:
        name: the table, relative to the folder; anything else, such as a description, gives nothing.
        folder: where the analysis file lies.
        region: the region.

    Returns:
        True if it does, read with the region's choices.

    Source:
        none, definition
    """
    try:
        table = read_table_beside(name, folder)
        read = None if table is None else replace(region, table=table, zeroed=())
    except InputError:
        return False
    return read is not None and numbers_digest(read.table) == numbers_digest(region.table)
