"""Every input in tests/bad/ is refused with exactly the message beside it.

A case is a file `<case>.csv`, `.tsv` or `.toml` and its message `<case>.error.txt`: adding one needs no code.
Tables that a `.toml` case reads have no message of their own.
"""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from workbench.commands.main import main
from workbench.counts.csv_table import read_csv_table
from workbench.counts.region import Region
from workbench.errors import InputError
from workbench.hypotheses.file.reading import read_analysis

BAD = Path(__file__).parent / "bad"
MESSAGE = ".error.txt"
CASES = sorted(
    path.name for path in BAD.iterdir() if path.suffix != ".txt" and path.with_suffix(MESSAGE).exists()
)
BLOCK = re.compile(r"\S.*\n  where     \S.*\n  found     \S.*\n  expected  \S.*\n  try       \S.*")


def read(path: Path) -> object:
    """Read a file as the command line would."""
    if path.suffix == ".toml":
        return read_analysis(path)
    return Region(path.stem, read_csv_table(path))


def explain(name: str) -> str:
    """Return what is said about a file that should be refused."""
    path = Path(name)
    with pytest.raises(InputError) as refusal:
        read(path)
    return "\n\n".join(problem.text() for problem in refusal.value.problems)


@pytest.mark.parametrize("name", CASES)
def test_a_bad_input_is_refused_with_the_message_beside_it(
    name: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(BAD)
    assert explain(name) + "\n" == Path(name).with_suffix(MESSAGE).read_text(encoding="utf-8")


@pytest.mark.parametrize("name", CASES)
def test_the_command_line_says_the_same_and_nothing_else(
    name: str, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.chdir(BAD)
    assert main(["check", name]) == 2
    said = capsys.readouterr()
    assert said.out == ""
    assert said.err == Path(name).with_suffix(MESSAGE).read_text(encoding="utf-8")


@pytest.mark.parametrize("name", CASES)
def test_a_message_has_all_its_parts_and_no_scolding(name: str) -> None:
    text = (BAD / name).with_suffix(MESSAGE).read_text(encoding="utf-8")
    assert all(BLOCK.fullmatch(block) for block in text.removesuffix("\n").split("\n\n"))
    assert re.search(r"\binvalid\b|\bplease\b|!$", text, re.IGNORECASE | re.MULTILINE) is None


def test_there_are_at_least_forty_cases_and_none_shares_its_message() -> None:
    messages = {Path(name).stem for name in CASES}
    assert len(CASES) == len(messages) >= 40


def test_every_file_is_a_case_a_message_or_a_table_of_a_case() -> None:
    declared = "".join(path.read_text(encoding="utf-8", errors="replace") for path in BAD.glob("*.toml"))
    messages = {path.name.removesuffix(MESSAGE) for path in BAD.glob("*" + MESSAGE)}
    stems = {Path(name).stem for name in CASES}
    tables = {path.name for path in BAD.iterdir() if path.suffix != ".txt"} - set(CASES)
    assert messages == stems
    assert [name for name in sorted(tables) if name not in declared] == []
