"""What is said about an input names things in one way: in double quotes, on one line."""

from __future__ import annotations

import ast
import pickle
from pathlib import Path

import pytest

import workbench
from workbench.errors import InputError, Problem, nearest, quoted

SOURCES = sorted(Path(workbench.__file__).parent.rglob("*.py"))
FOR_PROGRAMMERS = {"__init__.py", "faults.py"}  # Python's own AttributeError, and the file of a fault of ours


@pytest.mark.parametrize(
    ("word", "expected"),
    [
        ("fakes", '"fakes"'),
        ("muon efficiency", '"muon efficiency"'),
        ("two\nlines \x1b[31m", r'"two\u000alines \u001b[31m"'),
        ("long " * 20, '"' + ("long " * 20)[:57] + '..."'),
    ],
)
def test_a_name_stands_in_double_quotes_on_one_line(word: str, expected: str) -> None:
    assert quoted(word) == expected


def test_the_nearest_word_stands_in_the_same_quotes() -> None:
    assert nearest("wiegh", ["weigh", "check"]) == 'write "weigh"'


def spelt_by_python(path: Path) -> list[int]:
    """Return the lines that put Python's own spelling of a value, with its single quotes, into a text."""
    nodes = ast.walk(ast.parse(path.read_text(encoding="utf-8")))
    return [
        node.lineno for node in nodes if isinstance(node, ast.FormattedValue) and node.conversion == ord("r")
    ]


def test_no_text_for_the_user_has_pythons_quotes() -> None:
    """Two warnings about the same source quoted its name in two ways."""
    found = {path.name: lines for path in SOURCES if (lines := spelt_by_python(path))}
    assert set(found) <= FOR_PROGRAMMERS, found


def test_pythons_quotes_would_be_found(tmp_path: Path) -> None:
    path = tmp_path / "quoting.py"
    path.write_text('text = f"no column {name!r}"\n')
    assert spelt_by_python(path) == [1]


def test_an_error_comes_back_from_another_process_with_its_problems() -> None:
    """Worker processes broke down on it: only its text travelled, and could not be made an error again."""
    problem = Problem("Negative count", "line 3", "-1", "zero or more", "correct it")
    again = pickle.loads(pickle.dumps(InputError(problem, problem)))
    assert (again.problems, str(again)) == ((problem, problem), f"{problem.text()}\n\n{problem.text()}")
