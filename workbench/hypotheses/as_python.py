"""An analysis as the Python cell that makes the same analysis."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import MISSING, Field, fields, is_dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from workbench.counts.region import Region
from workbench.counts.table import Table
from workbench.hypotheses.file.table_files import holds_region
from workbench.hypotheses.python_text import (
    Brackets,
    Piece,
    laid_out,
    number_text,
    prefixed,
    string_text,
    tuple_of,
)

if TYPE_CHECKING:
    from workbench.hypotheses.analysis import Analysis

KINDS = ("parameters", "processes", "uncertainties", "hypotheses")
REMARKS = ("zeroed",)  # what a declaration notes about its making
READ = "wb.read_csv_table("


def as_python(analysis: Analysis, folder: str | Path | None = None) -> str:
    """Return the cell that makes an analysis: run, it leaves the same one in `analysis`.

    Args:
        analysis: the analysis.
        folder: where the cell will run: a table whose file there still holds the same numbers is read from
            it. Left out, all numbers stand in the cell.

    Returns:
        Python that needs `workbench` and nothing else; names are texts in it, never code.

    Source:
        none, definition
    """
    place = None if folder is None else Path(folder)
    tables = {region.name: _table(region, place) for region in analysis.regions}
    regions = [_made(one, {"table": prefixed("table=", tables[one.name])}) for one in analysis.regions]
    given = [
        prefixed("title=", string_text(analysis.title)),
        prefixed("regions=", tuple_of(regions)),
        *(prefixed(f"{kind}=", _piece(getattr(analysis, kind))) for kind in KINDS if getattr(analysis, kind)),
    ]
    if analysis.exposure is not None:
        given.append(prefixed("exposure=", _piece(analysis.exposure)))
    cell = laid_out(Brackets("analysis = wb.Analysis(", tuple(given), ")"))
    is_read = any(table.start == READ for table in tables.values())
    return ("from pathlib import Path\n\n" if is_read else "") + f"import workbench as wb\n\n{cell}\n"


def _table(region: Region, folder: Path | None) -> Brackets:
    name = region.table.source
    if folder is not None and holds_region(name, folder, region):
        return Brackets(READ, (f"Path({string_text(name)})",), ")")
    table = region.table
    given = [
        prefixed("binning=", _binning(table)),
        prefixed("observed=", "None" if table.observed is None else _numbers(table.observed)),
    ]
    for kind, columns in (("columns", table.columns), ("errors", table.errors)):
        named = [prefixed(f"{string_text(key)}: ", _numbers(one)) for key, one in columns.items()]
        given += [Brackets(f"{kind}={{", tuple(named), "}")] if named else []
    return Brackets("wb.Table(", tuple(given), ")")


def _binning(table: Table) -> Piece:
    binning = table.binning
    if np.array_equal(binning.low[1:], binning.high[:-1]):
        edges = [*binning.low, binning.last]
        return Brackets("wb.Binning.from_edges(", (_numbers(edges),), ")")
    ends = (prefixed("low=", _numbers(binning.low)), prefixed("high=", _numbers(binning.high)))
    return Brackets("wb.Binning(", ends, ")")


def _numbers(numbers: Iterable[float]) -> Piece:
    """Return the numbers of a table, which is the same whether they are written as whole or not."""
    plain = (float(one) for one in numbers)
    texts = (str(int(one)) if one.is_integer() and abs(one) < 1e15 else repr(one) for one in plain)
    return Brackets("[", tuple(texts), "]", is_filled=True)


def _made(noun: Any, said: Mapping[str, Piece]) -> Piece:
    """Return the call that makes a declaration; what says what its absence says is left out."""
    given = []
    for field in fields(noun):
        value = getattr(noun, field.name)
        if field.name in said:
            given.append(said[field.name])
        elif field.name not in REMARKS and not _is_default(field, value):
            piece = _piece(value)
            given.append(piece if field.name == "name" else prefixed(f"{field.name}=", piece))
    return Brackets(f"wb.{type(noun).__name__}(", tuple(given), ")")


def _is_default(field: Field[Any], value: object) -> bool:
    if field.default_factory is not MISSING:
        return bool(value == field.default_factory())
    return field.default is not MISSING and type(value) is type(field.default) and value == field.default


def _piece(value: object) -> Piece:
    if value is None or isinstance(value, bool):
        return str(value)
    if isinstance(value, str):
        return string_text(value)
    if is_dataclass(value):
        return _made(value, {})
    if isinstance(value, Mapping):
        pieces = (prefixed(f"{string_text(key)}: ", _piece(one)) for key, one in value.items())
        return Brackets("{", tuple(pieces), "}")
    if isinstance(value, tuple | list):
        return tuple_of([_piece(one) for one in value])
    return number_text(value)  # type: ignore[arg-type]  # what else stands in an analysis is a number
