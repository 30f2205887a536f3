"""Every way of ending has its text and its exit code."""

from __future__ import annotations

import importlib
import os
import re
import subprocess
import sys
from pathlib import Path
from types import ModuleType

import pytest

from workbench.commands.main import COMMANDS, main
from workbench.errors import InputError, Problem

BLOCK = re.compile(r"\S.*\n  where     \S.*\n  found     \S.*\n  expected  \S.*\n  try       \S.*")
ROOT = Path(__file__).parents[2]


def ending_with(monkeypatch: pytest.MonkeyPatch, error: BaseException) -> None:
    """Make the command `weigh` end with an exception."""
    module = ModuleType("ending")

    def run(options: object) -> int:
        raise error

    module.__dict__.update(add_options=lambda parser: None, run=run)
    monkeypatch.setitem(sys.modules, "ending", module)
    monkeypatch.setitem(COMMANDS, "weigh", ("ending", "ends"))


@pytest.mark.parametrize(
    ("words", "found", "remedy"),
    [
        ([], "nothing after the program's name", "oddsbench weigh FILE, or oddsbench --help"),
        (["wiegh", "a.toml"], '"wiegh"', 'write "weigh"'),
        (["--jsn"], '"--jsn"', f"use one of: {', '.join(sorted(COMMANDS))}"),
        (["weigh"], "no FILE", "oddsbench weigh FILE, or --help"),
        (["weigh", "a.toml", "--jsn"], '"--jsn"', 'write "--json"'),
        (["weigh", "a.toml", "--sed=3"], '"--sed"', 'write "--seed"'),
        (["weigh", "a.toml", "b.toml"], '"b.toml"', "name one file at a time"),
        (["weigh", "a.toml", "--seed"], "nothing after it", "oddsbench weigh --help"),
        (["weigh", "a.toml", "--seed", "minus one"], '"minus one"', "--seed 1"),
        (["weigh", "a.toml", "--seed", "-1"], '"-1"', "--seed 1"),
        (["weigh", "a.toml", "--pseudo-experiments", "20"], '"20"', "--pseudo-experiments 200"),
        (["weigh", "a.csv", "--background-uncertainty", "10%"], '"10%"', "--background-uncertainty 0.10"),
        (["weigh", "a.toml", "--json=yes"], 'ignored explicit argument "yes"', "oddsbench weigh --help"),
        (["fit", "a.toml", "--seed", "3"], '"--seed"', 'write "--save"'),
        (["weigh", "a.root"], "no such file", "check the name and the folder"),
        (["weigh", "a.toml", "--picture", "odds.gif"], '"odds.gif"', "--picture odds.png"),
        (["weigh", "a.toml", "--output", "nowhere/a.json"], '"nowhere/a.json"', 'make "nowhere"'),
    ],
)
def test_a_wrong_command_line_is_answered_in_the_form_of_every_problem(
    words: list[str],
    found: str,
    remedy: str,
    capsys: pytest.CaptureFixture[str],
    tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    monkeypatch.chdir(tmp_path)
    assert main(words) == 2
    said = capsys.readouterr()
    assert said.out == ""
    blocks = said.err.removesuffix("\n").split("\n\n")
    assert all(BLOCK.fullmatch(block) for block in blocks), said.err
    assert f"  found     {found}\n" in said.err
    assert f"  try       {remedy}" in said.err


def test_all_problems_are_told_at_once(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    one, two = Problem("A", "b", "c", "d", "e"), Problem("F", "g", "h", "i", "j")
    ending_with(monkeypatch, InputError(one, two))
    assert main(["weigh", "a.toml"]) == 2
    assert capsys.readouterr().err == f"{one.text()}\n\n{two.text()}\n"


def test_a_fault_of_ours_says_so_and_names_the_file_to_send(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str], tmp_path: Path
) -> None:
    monkeypatch.setattr("tempfile.tempdir", str(tmp_path))
    ending_with(monkeypatch, ZeroDivisionError("nothing to divide by"))
    assert main(["weigh", "some counts.toml"]) == 3
    said = capsys.readouterr()
    assert BLOCK.fullmatch(said.err.removesuffix("\n"))
    assert "A fault of oddsbench, not of your input" in said.err
    assert "Traceback" not in said.out + said.err
    (kept,) = tmp_path.iterdir()
    assert str(kept) in said.err
    text = kept.read_text(encoding="utf-8")
    assert "oddsbench weigh 'some counts.toml'" in text
    assert "Traceback" in text
    assert "numpy" in text


def test_a_fault_is_told_even_where_no_file_can_be_written(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str], tmp_path: Path
) -> None:
    monkeypatch.setattr("tempfile.tempdir", str(tmp_path / "nowhere"))
    ending_with(monkeypatch, ZeroDivisionError())
    assert main(["weigh", "a.toml"]) == 3
    assert "  found     ZeroDivisionError\n" in capsys.readouterr().err


def test_stopping_is_said_in_one_word(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    ending_with(monkeypatch, KeyboardInterrupt())
    assert main(["weigh", "a.toml"]) == 130
    assert capsys.readouterr().err == "\nStopped.\n"


@pytest.mark.parametrize(
    "words", [["--help"], ["-h"], ["weigh", "--help"], ["check", "-h"], ["fit", "--help"]]
)
def test_help_is_given_on_standard_output(words: list[str], capsys: pytest.CaptureFixture[str]) -> None:
    assert main(words) == 0
    said = capsys.readouterr()
    assert said.out.startswith("usage: oddsbench")
    assert said.err == ""


def test_the_version_is_told(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["--version"]) == 0
    assert re.fullmatch(r"oddsbench \d+\.\d+\.\d+\n", capsys.readouterr().out)


def test_every_command_in_the_list_can_be_run() -> None:
    for home, summary in COMMANDS.values():
        module = importlib.import_module(home)
        assert callable(module.run)
        assert callable(module.add_options)
        assert summary


def child(code: str) -> subprocess.CompletedProcess[str]:
    """Run Python code in a fresh process."""
    environment = {**os.environ, "PYTHONPATH": str(ROOT)}
    return subprocess.run(
        [sys.executable, "-c", code],
        capture_output=True,
        text=True,
        env=environment,
        timeout=60,
        check=False,
    )


def test_finding_the_command_imports_no_numbers() -> None:
    code = "print(sorted({'numpy', 'scipy', 'matplotlib'} & set(sys.modules)))"
    assert child(f"import sys, workbench.commands.main; {code}").stdout == "[]\n"


def test_a_reader_who_leaves_early_is_no_fault() -> None:
    code = (
        "import os, sys\n"
        "from workbench.commands.main import main\n"
        "reading, writing = os.pipe()\n"
        "os.close(reading)\n"
        "os.dup2(writing, 1)\n"
        "sys.exit(main(['--help']))\n"
    )
    ended = child(code)
    assert (ended.returncode, ended.stderr) == (0, "")


def test_the_signal_of_the_keyboard_ends_with_130() -> None:
    code = (
        "import os, signal, sys\n"
        "signal.signal(signal.SIGINT, signal.default_int_handler)\n"  # ignored where the tests run unattended
        "from workbench.commands import main\n"
        "main._dispatch = lambda asked: os.kill(os.getpid(), signal.SIGINT) or __import__('time').sleep(5)\n"
        "sys.exit(main.main(['weigh', 'a.toml']))\n"
    )
    ended = child(code)
    assert (ended.returncode, ended.stderr) == (130, "\nStopped.\n")
