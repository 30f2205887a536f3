"""Saved notebooks run from a fresh copy, without an error, to the numbers that are printed in them."""

from __future__ import annotations

import os
import shutil
import warnings
from pathlib import Path

import nbformat
import pytest

from tests.measured import measured, strays

with warnings.catch_warnings():
    warnings.simplefilter("ignore", DeprecationWarning)  # of the libraries that it imports, not of ours
    from nbclient import NotebookClient

ROOT = Path(__file__).parents[2]
SAVED = sorted((ROOT / "notebooks").glob("*.ipynb"))
LARGEST = 400_000  # bytes of a saved notebook with its pictures


def read(path: Path) -> nbformat.NotebookNode:
    notebook: nbformat.NotebookNode = nbformat.read(path, as_version=4)  # type: ignore[no-untyped-call]
    return notebook


def printed(notebook: nbformat.NotebookNode) -> str:
    """Return everything that a notebook's cells printed, in order."""
    outputs = [output for cell in notebook.cells for output in cell.get("outputs", [])]
    return "".join(output.text for output in outputs if output.output_type == "stream")


@pytest.fixture(params=SAVED, ids=lambda path: path.stem)
def saved(request: pytest.FixtureRequest) -> Path:
    path: Path = request.param
    return path


def test_there_are_saved_notebooks() -> None:
    assert SAVED


@pytest.mark.slow
@pytest.mark.filterwarnings("ignore::DeprecationWarning")
@pytest.mark.filterwarnings("ignore::ResourceWarning")
@pytest.mark.filterwarnings("ignore::UserWarning")
def test_a_notebook_runs_again_to_the_same_numbers_within_their_errors(saved: Path, tmp_path: Path) -> None:
    for folder in ("notebooks", "data"):
        shutil.copytree(ROOT / folder, tmp_path / folder, ignore=shutil.ignore_patterns(".ipynb_checkpoints"))
    notebook = read(tmp_path / "notebooks" / saved.name)
    client = NotebookClient(
        notebook,
        timeout=300,
        kernel_name="python3",
        resources={"metadata": {"path": str(tmp_path / "notebooks")}},
    )
    client.execute(env={**os.environ, "PYTHONPATH": str(ROOT)})
    before, again = printed(read(saved)), printed(notebook)
    assert measured(before), "nothing with an error was printed"
    assert strays(before, again) == [], again


def test_a_notebook_is_saved_whole_in_order_and_small(saved: Path) -> None:
    notebook = read(saved)
    code = [cell for cell in notebook.cells if cell.cell_type == "code"]
    assert [cell.execution_count for cell in code] == list(range(1, len(code) + 1))
    kinds = {output.output_type for cell in code for output in cell.outputs}
    assert kinds <= {"stream", "display_data", "execute_result"}
    names = {output.name for cell in code for output in cell.outputs if output.output_type == "stream"}
    assert names <= {"stdout"}, "a warning was saved"
    assert saved.stat().st_size < LARGEST


def test_a_notebook_asks_for_nothing_but_a_python_kernel(saved: Path) -> None:
    metadata = read(saved).metadata
    assert metadata.kernelspec.name == "python3"
    assert set(metadata) == {"kernelspec", "language_info"}
    assert str(ROOT) not in saved.read_text(encoding="utf-8")


def test_a_number_that_moved_is_found() -> None:
    assert strays("ln B = −8.003 ± 0.005", "ln B = −8.010 ± 0.005") == []
    assert strays("odds = 2,990 ± 16 : 1", "odds = 3,004 ± 16 : 1") == []
    assert len(strays("ln B = −8.003 ± 0.005", "ln B = 8.003 ± 0.005")) == 1
    assert len(strays("odds = 2,990 ± 16 : 1", "odds = 3,190 ± 16 : 1")) == 1
    assert len(strays("ln B = 8.003 ± 0.005", "")) == 1
