"""Whatever a file holds, reading it gives an analysis or an InputError, never anything else.

Two thousand files are made from valid ones by deleting, doubling and swapping lines, by replacing values, by
misspelling keys and by bytes that are noise. Warnings are errors here too.
"""

from __future__ import annotations

from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from tests.mutations import edited, edits, tables_beside
from workbench.errors import InputError
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.file.reading import read_analysis
from workbench.hypotheses.file.writing import write_analysis

ROOT = Path(__file__).parents[2]
FILES = [
    Path(__file__).parent / "files" / "everything.toml",
    Path(__file__).parent / "files" / "alternatives.toml",
    *(ROOT / "data" / name / f"{name}.toml" for name in ("skerry", "tarn", "sorrel")),
]


def hostile_file(folder: Path, which: int, changes: list[tuple[object, ...]]) -> Path:
    """Write one of the valid files after some edits beside its tables."""
    data = FILES[which].read_bytes()
    for change in changes:
        data = edited(data, change)
    path = folder / "hostile.toml"
    path.write_bytes(data)
    return path


def read_or_refuse(path: Path) -> Analysis | None:
    """Return the analysis, or None where it is refused with problems that can be shown."""
    try:
        return read_analysis(path)
    except InputError as error:
        problems = error.problems
    assert problems
    for problem in problems:
        lines = problem.text().split("\n")
        assert len(lines) == 5
        assert all(line.strip() for line in lines)
    return None


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Return a folder with the tables of every valid file."""
    return tables_beside(tmp_path_factory.mktemp("hostile"), FILES)


@given(st.integers(0, len(FILES) - 1), st.lists(edits, min_size=1, max_size=3))
@settings(
    max_examples=2000, derandomize=True, deadline=None, database=None, suppress_health_check=list(HealthCheck)
)
def test_a_mutated_file_is_an_analysis_or_an_input_error(
    folder: Path, which: int, changes: list[tuple[object, ...]]
) -> None:
    analysis = read_or_refuse(hostile_file(folder, which, changes))
    if analysis is not None:
        for hypothesis in analysis.hypotheses:
            assert set(analysis.signal_parameters(hypothesis.name)) <= set(
                analysis.parameters_used(hypothesis.name)
            )
            analysis.sources_used(hypothesis.name)
        assert analysis.digest.startswith("sha256:")


@given(st.integers(0, len(FILES) - 1), st.lists(edits, min_size=1, max_size=1))
@settings(
    max_examples=150, derandomize=True, deadline=None, database=None, suppress_health_check=list(HealthCheck)
)
def test_what_is_read_from_a_mutated_file_can_be_written_and_read_again(
    folder: Path, which: int, changes: list[tuple[object, ...]]
) -> None:
    path = hostile_file(folder, which, changes)
    analysis = read_or_refuse(path)
    if analysis is not None:
        write_analysis(analysis, folder / "again.toml", keep=path)
        assert read_analysis(folder / "again.toml") == analysis


@pytest.mark.parametrize("file", FILES, ids=lambda file: file.stem)
def test_the_files_that_are_mutated_are_valid_themselves(file: Path) -> None:
    """Without this the two tests above could pass by refusing everything."""
    assert read_or_refuse(file) is not None


def test_many_mutated_files_are_still_read(folder: Path) -> None:
    """The edits are not so coarse that nothing is left to read."""
    read = [
        read_or_refuse(hostile_file(folder, 0, [("value", place / 100, "2")])) is not None
        for place in range(100)
    ]
    assert 10 < sum(read) < 90
