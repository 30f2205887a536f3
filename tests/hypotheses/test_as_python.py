"""The cell that an analysis is shown as makes the same analysis, whatever its names hold.

The expectation is the content's digest; the cell is run by Python itself, and taken apart by its own parser.
"""

from __future__ import annotations

import ast
import os
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import workbench as wb
from tests.analyses import counting, everything, region_of
from workbench.hypotheses.as_python import as_python
from workbench.hypotheses.priors import FAMILIES
from workbench.hypotheses.python_text import string_text
from workbench.hypotheses.shapes import SHAPES

ROOT = Path(__file__).parents[2]
FILES = [*sorted((ROOT / "data").rglob("*.toml")), *sorted((Path(__file__).parent / "files").glob("*.toml"))]


def made_by(cell: str) -> wb.Analysis:
    """Run a cell as a notebook would and return what it leaves in `analysis`."""
    names: dict[str, Any] = {}
    exec(compile(cell, "cell", "exec"), names)
    made = names["analysis"]
    assert isinstance(made, wb.Analysis)
    return made


@pytest.mark.parametrize("file", FILES, ids=lambda file: file.stem)
def test_the_cell_makes_the_same_analysis_wherever_it_runs(file: Path, tmp_path: Path) -> None:
    analysis = wb.read_analysis(file)
    was = Path.cwd()
    os.chdir(tmp_path)
    try:
        assert made_by(as_python(analysis)).digest == analysis.digest
    finally:
        os.chdir(was)


@pytest.mark.parametrize("file", FILES, ids=lambda file: file.stem)
def test_beside_its_tables_the_cell_reads_them_and_makes_the_same_analysis(
    file: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    analysis = wb.read_analysis(file)
    monkeypatch.chdir(file.parent)
    cell = as_python(analysis, file.parent)
    assert "wb.read_csv_table(" in cell
    assert made_by(cell).digest == analysis.digest


def test_a_table_that_has_changed_since_is_written_into_the_cell(tmp_path: Path) -> None:
    for name in ("skerry.toml", "skerry-peak.csv"):
        (tmp_path / name).write_bytes((ROOT / "data" / "skerry" / name).read_bytes())
    analysis = wb.read_analysis(tmp_path / "skerry.toml")
    table = tmp_path / "skerry-peak.csv"
    assert "read_csv_table" in as_python(analysis, tmp_path)
    table.write_text(table.read_text().replace("44,45,39", "44,45,40"))
    cell = as_python(analysis, tmp_path)
    assert "read_csv_table" not in cell
    assert made_by(cell).digest == analysis.digest


@pytest.mark.parametrize("template_errors", [True, False])
def test_every_shape_prior_and_effect_comes_back(template_errors: bool) -> None:
    analysis = everything(template_errors=template_errors)
    assert made_by(as_python(analysis)).digest == analysis.digest


def test_every_class_that_a_cell_may_name_is_public() -> None:
    classes = [*SHAPES.values(), *FAMILIES.values()]
    assert [one.__name__ for one in classes if getattr(wb, one.__name__, None) is not one] == []


def test_gaps_planning_and_numbers_of_any_type_come_back() -> None:
    plain = counting(3.0, 2.0)
    table = wb.Table(wb.Binning([0.0, 2.0], [1.0, 3.5]), None, {"a": [0.1 + 0.2, 1e-300]})
    odd = replace(
        plain,
        regions=(wb.Region("only", table, empty_bin_events=1),),
        exposure=wb.Exposure(np.float64(3.5), uncertainty=0),
    )
    assert made_by(as_python(odd)).digest == odd.digest


@pytest.mark.parametrize("source", ["nul\0", "x" * 5000, "../" * 50, "", "a histogram drawn by hand"])
def test_a_table_from_nowhere_is_written_into_the_cell(source: str, tmp_path: Path) -> None:
    plain = counting(3.0, 2.0)
    table = replace(plain.regions[0].table, source=source)
    odd = replace(plain, regions=(replace(plain.regions[0], table=table),))
    assert as_python(odd, tmp_path) == as_python(plain)


HOSTILE = [
    'a" + __import__("os").getcwd() + "',
    "back\\slash\\",
    "'''\"\"\"",
    "{braces} %s $(x)",
    "ν → µ\u00e9 漢",
    'ends with a backslash and a quote\\"',
    "table=wb.read_csv_table(",
]


@pytest.mark.parametrize("name", HOSTILE)
def test_a_name_is_a_text_and_never_code(name: str) -> None:
    region = region_of([0.0, 1.0], [3.0], {name: [2.0], "s": [1.0]}, name=name)
    analysis = wb.Analysis(
        name + "\n\u202e\x7f\x00\U000e0001",
        (replace(region, unit="\ud800", observable=name),),
        (wb.Parameter(name, wb.Uniform(0.0, 5.0), unit=name),),
        (
            wb.Process("b", "background", {name: wb.Contribution(wb.Template(name))}),
            wb.Process(name, "signal", {name: wb.Contribution(wb.Template("s"))}, (name,)),
        ),
        (wb.Uncertainty(name + " too", (wb.Effect(name, 0.1),)),),
    )
    cell = as_python(analysis)
    assert made_by(cell).digest == analysis.digest
    assert all(letter.isprintable() or letter == "\n" for letter in cell)
    calls = {ast.unparse(node.func) for node in ast.walk(ast.parse(cell)) if isinstance(node, ast.Call)}
    assert all(call.startswith("wb.") for call in calls)


@given(st.text())
@settings(max_examples=500, deadline=None, derandomize=True)
def test_any_text_is_read_back_by_python_as_it_was(text: str) -> None:
    written = string_text(text)
    assert ast.literal_eval(written) == text
    assert written.isprintable()


def test_the_cell_of_the_demonstration_reads_as_one_would_type_it() -> None:
    folder = ROOT / "data" / "skerry"
    cell = as_python(wb.read_analysis(folder / "skerry.toml"), folder)
    assert cell.startswith("from pathlib import Path\n\nimport workbench as wb\n\nanalysis = wb.Analysis(\n")
    assert '        wb.Parameter("strength", prior=wb.Uniform(low=0.0, high=5.0)),\n' in cell
    assert max(len(line) for line in cell.split("\n")) <= 100
