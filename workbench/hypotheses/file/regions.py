"""Regions as the analysis file says them: a table beside the file, or bins written in it."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path, PurePosixPath, PureWindowsPath

import numpy as np

from workbench.counts.binning import Binning
from workbench.counts.csv_table import read_csv_table
from workbench.counts.region import Region
from workbench.counts.table import Table
from workbench.errors import InputError, Problem, quoted, shortened
from workbench.hypotheses.faults import KeyPath, shown
from workbench.hypotheses.file.keys import Findings, Section

INLINE_SOURCE = "edges and counts in the analysis file"


def read_region(name: str, section: Section, folder: Path) -> Region | None:
    """Return a region; None, with the faults noted, where it cannot be read.

    Args:
        name: the region's name.
        section: its table of the file.
        folder: what `table` is relative to.

    Returns:
        The region, or None.
    """
    choices = {
        "observable": section.text("observable", ""),
        "unit": section.text("unit", ""),
        "template_errors": section.truth("template_errors", False)
        if section.has("template_errors")
        else None,
        "negative_templates": section.text("negative_templates", "refuse"),
        "empty_bin_events": section.number_if_given("empty_bin_events"),
    }
    table = _table(section, folder, str(choices["negative_templates"]))
    section.close()
    if table is None or not section.is_sound:
        return None
    findings = section.findings
    try:
        return Region(name=name, table=table, **choices)  # type: ignore[arg-type]  # one dict of several types
    except InputError as error:
        for problem in error.problems:
            findings.tell(_placed(problem, name, findings), section.path)
        return None


def _table(section: Section, folder: Path, negative_templates: str) -> Table | None:
    """Return the region's table from the file that it names, or from the bins that it writes."""
    if section.has("table"):
        for key in ("edges", "observed"):
            if section.has(key):
                section.refuse(
                    key,
                    f"{key} beside a table",
                    f"table and {key}",
                    "a table, or edges and observed",
                    f"leave out table or {key}",
                )
        name = section.text("table")
        return _table_file(name, section, folder, negative_templates) if section.is_sound else None
    if not section.has("edges"):
        section.refuse(
            None,
            "A region without bins",
            "neither table nor edges",
            "a table, or edges and observed",
            'add table = "FILE.csv"',
        )
        return None
    edges = section.numbers("edges")
    observed = section.numbers("observed") if section.has("observed") else None
    if not section.is_sound:
        return None
    try:
        counts = None if observed is None else np.array(observed)
        return Table(Binning.from_edges(np.array(edges)), counts, source=INLINE_SOURCE)
    except InputError as error:
        section.is_sound = False
        for problem in error.problems:
            section.findings.tell(_inline(problem, section), section.path)
        return None


def _table_file(name: str, section: Section, folder: Path, negative_templates: str) -> Table | None:
    fault = _path_fault(name, folder)
    if fault is not None:
        what, found, expected = fault
        remedy = "keep the table beside the analysis file and write its name alone"
        section.refuse("table", what, found, expected, remedy)
        return None
    try:
        return read_csv_table(folder / name, name, negative_templates=negative_templates)
    except InputError as error:
        section.is_sound = False
        for problem in error.problems:
            where = f"{section.findings.place((*section.path, 'table'))}, file {name}"
            told = replace(problem, where=where) if problem.where == name else problem
            section.findings.tell(told, section.path)
        return None


def read_table_beside(name: str, folder: Path) -> Table | None:
    """Return the table of that name as an analysis file in that folder would read it.

    Args:
        name: a path relative to the folder.
        folder: where the analysis file lies.

    Returns:
        The table; None where an analysis file may not name it.

    Raises:
        InputError: if it is no table.

    Source:
        none, definition
    """
    return None if _path_fault(name, folder) is not None else read_csv_table(folder / name, name)


def _path_fault(name: str, folder: Path) -> tuple[str, str, str] | None:
    """Return what, found and expected of a path that an analysis file may not name; None where it may."""
    if PurePosixPath(name).is_absolute() or PureWindowsPath(name).anchor or not name.strip():
        what = "A table that is not beside the analysis file"
        return what, shown(name), "a path relative to the analysis file"
    try:
        path = folder / name
        leads_away = not _stays_where_it_says(name, folder)
        is_special = path.exists() and not path.is_file() and not path.is_dir()
    except (OSError, ValueError, RuntimeError) as error:
        what = "A table whose path cannot be followed"
        return what, shown(name), f"a path that can be opened ({shortened(str(error))})"
    if leads_away or is_special:
        found = "a link that leads to another folder" if leads_away else "no regular file"
        what = "A table that is not the file it says"
        return what, f"{quoted(name)}, {found}", "a regular file in the folder that the path names"
    return None


def _stays_where_it_says(name: str, folder: Path) -> bool:
    """Tell whether links keep the file inside the folder that the path's leading dots name."""
    parts = PurePosixPath(name).parts
    ups = 0
    while ups < len(parts) and parts[ups] == "..":
        ups += 1
    root = folder.joinpath(*parts[:ups]).resolve()
    return (folder / name).resolve().is_relative_to(root)


def _placed(problem: Problem, name: str, findings: Findings) -> Problem:
    """Return a region's problem with the place in the file instead of the region's name."""
    subject = f"region {quoted(name)}"
    if not problem.where.startswith(subject):
        return problem
    key = problem.where.removeprefix(subject).removeprefix(", ")
    path: KeyPath = ("regions", name, key) if key else ("regions", name)
    return replace(problem, where=findings.place(path))


def _inline(problem: Problem, section: Section) -> Problem:
    """Return a problem of bins written in the analysis, with the place in the file."""
    key = "observed" if quoted("observed") in problem.where else "edges"
    where = section.findings.place((*section.path, key))
    _, _, detail = problem.where.partition(", ")
    bins = detail.partition(", column")[0] if detail.startswith("bin") else ""
    return replace(problem, where=where + (f", {bins}" if bins else ""))
