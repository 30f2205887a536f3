"""Reads an analysis file, with every problem told at once."""

from __future__ import annotations

import math
import re
import tomllib
from pathlib import Path

from workbench.counts.files import read_bytes, text_of
from workbench.errors import InputError, Problem, shortened
from workbench.hypotheses.analysis import Analysis, declared_analysis
from workbench.hypotheses.checks import faults_of
from workbench.hypotheses.declared import Declared
from workbench.hypotheses.distortion import DEFAULT_TERMS, Distortion
from workbench.hypotheses.exposure import Exposure
from workbench.hypotheses.faults import KeyPath, dotted, shown, toml_fault_text
from workbench.hypotheses.file.keys import Findings, Section
from workbench.hypotheses.file.lines import key_lines, line_of
from workbench.hypotheses.file.priors import read_prior
from workbench.hypotheses.file.regions import read_region
from workbench.hypotheses.file.shapes import read_process
from workbench.hypotheses.file.uncertainties import read_uncertainty
from workbench.hypotheses.hypothesis import Hypothesis
from workbench.hypotheses.parameters import Parameter

FORMAT = 1
SYNTAX_PLACE = re.compile(
    r"^(?P<what>.*?) \(at (?:line (?P<line>\d+), column (?P<column>\d+)|end of document)\)$"
)


def read_analysis(path: str | Path) -> Analysis:
    """Return the analysis that a file declares.

    Args:
        path: a TOML file; its tables are looked for relative to it.

    Returns:
        The analysis, with what is worth knowing about it in `cautions`.

    Raises:
        InputError: with everything that is wrong, each with its file, line and key.

    Source:
        none, definition
    """
    place = Path(path)
    return analysis_from_text(text_of(read_bytes(place, str(path)), str(path)), place.parent, str(path))


def analysis_from_text(text: str, folder: Path, shown_as: str) -> Analysis:
    """Return the analysis that a TOML text declares.

    Args:
        text: what the file holds.
        folder: what its tables are relative to.
        shown_as: the file's name as the user gave it.

    Returns:
        The analysis.

    Raises:
        InputError: with everything that is wrong.
    """
    content = parsed(text, shown_as)
    lines = key_lines(text)

    def line(path: KeyPath) -> int | None:
        return line_of(path, lines)

    def place(path: KeyPath) -> str:
        where = f"{shown_as}, line {line(path)}" if line(path) else shown_as
        return f"{where}, {dotted(path)}" if path else where

    findings = Findings(place, line)
    root = Section(content, (), findings)
    _check_format(root)
    title = root.text("title", Path(shown_as).stem)
    declared = _declared(root, folder)
    root.close()
    for fault in faults_of(declared):
        findings.add(fault)
    if findings.problems:
        raise InputError(*findings.problems)
    return declared_analysis(title, declared)


def parsed(text: str, shown_as: str) -> dict[str, object]:
    """Return the tables of a TOML text, or raise an InputError that names the line."""
    try:
        return tomllib.loads(text)
    except (ValueError, RecursionError) as error:
        raise InputError(_syntax_problem(error, shown_as)) from error


def _syntax_problem(error: Exception, shown_as: str) -> Problem:
    where, found = shown_as, shortened(toml_fault_text(str(error)))
    if isinstance(error, RecursionError):
        found = "brackets nested too deeply to be read"
    match = SYNTAX_PLACE.match(str(error))
    if match:
        found = shortened(toml_fault_text(match["what"]))
        line = f"line {match['line']}, column {match['column']}" if match["line"] else "the last line"
        where = f"{shown_as}, {line}"
    return Problem(
        "A text that is not TOML",
        where,
        found,
        "TOML: [tables] and key = value, names with spaces in quotes",
        "mend this place; what comes after it has not been read",
    )


def _check_format(root: Section) -> None:
    value = root.value("format", str(FORMAT))
    if value is not None and (value != FORMAT or not isinstance(value, int) or isinstance(value, bool)):
        root.refuse(
            "format",
            "A format of analysis files that is not known",
            shown(value),
            f"format = {FORMAT}",
            f"write format = {FORMAT}, or use a later version of oddsbench",
        )


def _declared(root: Section, folder: Path) -> Declared:
    """Return everything the file declares; what could not be read is kept as a name without content."""
    return Declared(
        regions={
            name: None if inner is None else read_region(name, inner, folder)
            for name, inner in root.sections("regions", "a table of the region")
        },
        parameters={
            name: None if inner is None else _parameter(name, inner)
            for name, inner in root.sections("parameters", "a table with a prior")
        },
        processes={
            name: None if inner is None else read_process(name, inner)
            for name, inner in root.sections("processes", "a table of the process")
        },
        uncertainties={
            name: None if inner is None else read_uncertainty(name, inner)
            for name, inner in root.sections("uncertainties", "a table with effects")
        },
        hypotheses={
            name: None if inner is None else _hypothesis(name, inner)
            for name, inner in root.sections("hypotheses", "a table with processes")
        },
        exposure=_exposure(root) if root.has("exposure") else None,
    )


def _exposure(root: Section) -> Exposure | None:
    section = root.section("exposure", "a table")
    if section is None:
        return None
    collected, unit = section.number("collected"), section.text("unit", "")
    uncertainty = section.number_if_given("uncertainty")
    section.close()
    return Exposure(collected, unit, uncertainty) if section.is_sound else None


def _parameter(name: str, section: Section) -> Parameter | None:
    unit, prior = section.text("unit", ""), read_prior(section)
    section.close()
    return Parameter(name, prior, unit) if prior is not None and section.is_sound else None


def _hypothesis(name: str, section: Section) -> Hypothesis | None:
    processes, prior = section.texts("processes"), section.number("prior", 1.0)
    fix: dict[str, float] = {}
    if section.has("fix"):
        holder = section.section("fix", "a table: parameter = number")
        fix = {} if holder is None else {key: holder.number(key) for key in holder.content}
        section.is_sound = section.is_sound and holder is not None and holder.is_sound
    distortion = _distortion(section) if section.has("distortion") else None
    section.close()
    is_read = section.is_sound and math.isfinite(prior)
    return Hypothesis(name, processes, prior, fix, distortion) if is_read else None


def _distortion(section: Section) -> Distortion | None:
    inner = section.section("distortion", "a table: size = a relative size such as 0.05")
    if inner is None:
        section.is_sound = False
        return None
    size, terms = inner.number("size"), inner.whole_number("terms", DEFAULT_TERMS)
    regions = inner.texts("regions") if inner.has("regions") else None
    inner.close()
    section.is_sound = section.is_sound and inner.is_sound
    return Distortion(size, terms, regions)
