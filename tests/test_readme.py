"""The README says what is so: its commands, screens, tables and its Python are held against the program."""

from __future__ import annotations

import json
import os
import re
import shlex
import subprocess
import sys
import tomllib
from collections.abc import Iterator
from dataclasses import fields
from importlib import import_module
from pathlib import Path
from typing import Any

import pytest

import workbench
from tests.measured import NUMBER, number, strays
from workbench.commands.main import COMMANDS, main
from workbench.commands.parsing import Parser
from workbench.hypotheses.file.reading import read_analysis
from workbench.hypotheses.priors import FAMILIES
from workbench.hypotheses.shapes import SHAPES

ROOT = Path(__file__).parents[1]
README = (ROOT / "README.md").read_text(encoding="utf-8")
FIRST = (
    "python3 -m venv .venv && .venv/bin/pip install . && .venv/bin/oddsbench weigh data/skerry/skerry.toml"
)
SECOND = "bash tests/run.sh"


def blocks(kind: str) -> list[str]:
    """Return what stands in the README's blocks of one kind."""
    return re.findall(rf"^```{kind}\n(.*?)^```$", README, re.MULTILINE | re.DOTALL)


def section(title: str) -> str:
    """Return a section of the README, its subsections left out."""
    match = re.search(rf"^#+ {re.escape(title)}\n(.*?)(?=^#|\Z)", README, re.MULTILINE | re.DOTALL)
    assert match, title
    return match.group(1)


def rows(title: str) -> dict[str, list[str]]:
    """Return the rows of a section's tables by the first name in each row."""
    lines = [line for line in section(title).splitlines() if line.startswith("| `")]
    cells = [[cell.strip() for cell in line.strip("|").split(" | ")] for line in lines]
    return {re.findall("`([^`]*)`", row[0])[0]: row for row in cells}


def named(text: str) -> set[str]:
    """Return everything in code marks, list marks and values taken off."""
    return {word.removesuffix("[]") for word in re.findall("`([^`]*)`", text)}


def commands() -> Iterator[tuple[list[str], str]]:
    """Yield the words of each command that the README shows, and what follows on the screen."""
    for block in blocks("console"):
        for part in block.split("$ ")[1:]:
            asked, _, screen = part.partition("\n")
            yield shlex.split(asked), screen


def run(words: list[str], capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch) -> str:
    monkeypatch.chdir(ROOT)
    main(words)
    said = capsys.readouterr()
    return said.out + said.err


def without_numbers(text: str) -> list[str]:
    """Return a screen's lines with numbers masked and spaces run together."""
    return [" ".join(re.sub(NUMBER, "#", line).split()) for line in text.splitlines()]


def test_the_two_commands_stand_alone_in_this_order() -> None:
    assert [block.strip() for block in blocks("")][:2] == [FIRST, SECOND]
    assert (ROOT / "tests" / "run.sh").is_file()


def test_pip_shows_the_readme() -> None:
    project = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["project"]
    assert project["readme"] == "README.md"


@pytest.mark.parametrize("words", [words for words, _ in commands()], ids=" ".join)
def test_a_command_that_is_shown_has_the_options_that_it_is_given(words: list[str]) -> None:
    program, command, *rest = words
    assert program == "oddsbench"
    if command in COMMANDS:
        parser = Parser(prog=command)
        import_module(COMMANDS[command][0]).add_options(parser)
        options = parser.understand(rest)
        if getattr(options, "reprior", None) is None:
            assert (ROOT / options.file).is_file()
        else:  # a record that a command shown above it keeps
            assert options.reprior in {word for others, _ in commands() for word in others[2:-1]}


def test_the_worked_example_is_what_the_program_prints(
    capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    words, shown = next(commands())
    again = run(words[1:3], capsys, monkeypatch)
    now = again[: again.index("\n\nCautions\n") + 1]
    assert without_numbers(shown) == without_numbers(now)
    assert strays(shown, now) == []
    for title in ("What was counted", "What is claimed", "prior of strength"):  # numbers without an error
        before, after = (
            [number(one) for one in re.findall(NUMBER, text.split(title)[1].split("\n\n")[0])]
            for text in (shown, now)
        )
        assert after == pytest.approx(before, rel=0.02)


def test_the_priors_that_are_shown_are_what_the_program_prints(
    capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    (shown,) = [screen for words, screen in commands() if words[1] == "priors"]
    again = run(["priors", "data/skerry/skerry.toml"], capsys, monkeypatch)
    now = again[again.index('The prior of "strength"') : again.index("\n\nCautions")] + "\n"
    assert without_numbers(shown.removeprefix("...\n")) == without_numbers(now)
    assert strays(shown, now) == []


def test_the_scan_that_is_shown_is_what_the_program_prints(
    capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    shown = [screen for words, screen in commands() if words[1] == "scan"]
    again = run(["scan", "data/skerry/skerry.toml", "--over", "mass"], capsys, monkeypatch)
    now = again[again.index("Updating ratio R") : again.index("\n\nCautions")] + "\n"
    without_bars = [re.sub(r"(?m) *[█◂]*│█* *", "", text) for text in (shown[0], now)]
    assert without_numbers(without_bars[0].removeprefix("...\n")) == without_numbers(without_bars[1])
    assert strays(shown[0], now) == []
    kept = str(tmp_path / "skerry-scan.json")
    run(["scan", "data/skerry/skerry.toml", "--output", kept], capsys, monkeypatch)
    ((words, shown_reading),) = [(words, text) for words, text in commands() if "--reprior" in words]
    reading = run([kept if word == "skerry-scan.json" else word for word in words[1:]], capsys, monkeypatch)
    after = reading[reading.index("Priors") : reading.index("\n\nCautions")] + "\n"
    before = shown_reading[shown_reading.index("Priors") :]
    assert without_numbers(before) == without_numbers(after)
    assert strays(before, after) == []


def test_the_backgrounds_that_are_shown_are_what_the_program_prints(
    capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    (shown,) = [screen for words, screen in commands() if words[1] == "backgrounds"]
    again = run(["backgrounds", "data/dunlin/dunlin.toml"], capsys, monkeypatch)
    now = again[again.index("Backgrounds in doubt") : again.index("\n\nWarnings")] + "\n"
    assert without_numbers(shown.removeprefix("...\n")) == without_numbers(now)
    assert strays(shown, now) == []


def test_the_ledger_that_is_shown_is_what_the_program_prints(
    capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    (shown,) = [screen for words, screen in commands() if words[1] == "ledger"]
    again = run(["ledger", "data/skerry/skerry.toml"], capsys, monkeypatch)
    now = again[again.index("What carries the evidence") : again.index("\n\nCautions")] + "\n"
    without_bars = [re.sub(r" +[+−]+ *$", "", text, flags=re.MULTILINE) for text in (shown, now)]
    assert without_numbers(without_bars[0].removeprefix("...\n")) == without_numbers(without_bars[1])
    assert strays(shown, now) == []


def test_the_error_that_is_shown_is_what_the_program_says(
    capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    *_, (words, shown) = commands()
    assert run(words[1:], capsys, monkeypatch) == shown


def test_the_python_example_prints_what_the_readme_says() -> None:
    (example,) = blocks("python")
    (shown,) = blocks("text")
    environment = {**os.environ, "PYTHONPATH": str(ROOT)}
    ran = subprocess.run(
        [sys.executable, "-X", "utf8", "-W", "error", "-c", example],
        cwd=ROOT,
        env=environment,
        capture_output=True,
        text=True,
        encoding="utf-8",
        check=False,
    )
    assert ran.stderr == ""
    assert without_numbers(ran.stdout) == without_numbers(shown)
    assert strays(shown, ran.stdout) == []
    assert [line for line in ran.stdout.splitlines() if "±" not in line] == [
        line for line in shown.splitlines() if "±" not in line
    ]


def test_the_analysis_file_that_is_shown_is_one(tmp_path: Path) -> None:
    (text,) = blocks("toml")
    path = tmp_path / "shown.toml"
    path.write_text(text, encoding="utf-8")
    analysis = read_analysis(path)
    assert analysis.cautions == ()
    assert [region.name for region in analysis.regions] == ["line", "sideband"]


def test_every_prior_family_is_listed_with_its_numbers() -> None:
    listed = {name: named(row[1]) for name, row in rows("Priors").items()}
    assert listed == {name: {field.name for field in fields(made)} for name, made in FAMILIES.items()}


@pytest.mark.parametrize(("name", "row"), rows("Priors").items())
def test_a_prior_that_is_said_to_be_not_scaled_is_not(name: str, row: list[str]) -> None:
    numbers = {"value": 1.0, "low": 1.0, "high": 2.0, "factor": 1.5}
    made: Any = FAMILIES[name]
    prior = made(**{field.name: numbers.get(field.name, 1.5) for field in fields(made)})
    is_scaled = name != "fixed" and prior.scaled(2.0) is not None
    assert is_scaled == (row[3] != "not scaled")


def test_every_shape_is_listed_with_its_numbers() -> None:
    listed = {name: named(row[1]) - {"{}"} for name, row in rows("Shapes").items()}
    assert listed == {name: {field.name for field in fields(made)} for name, made in SHAPES.items()}


def test_every_command_and_option_is_listed() -> None:
    table = section("Commands")
    assert {name.split()[1] for name in named(table) if name.startswith("oddsbench ")} == set(COMMANDS)
    listed = {option.split()[0] for option in named(table) if option.startswith("--")}
    known: set[str] = set()
    for home, _ in COMMANDS.values():
        parser = Parser(prog="x")
        import_module(home).add_options(parser)
        known |= {name for action in parser._actions for name in action.option_strings if name[:2] == "--"}
    assert listed == known - {"--help"}


def test_every_key_of_the_record_is_listed(
    capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    record = json.loads(run(["weigh", "data/sorrel/sorrel.toml", "--json"], capsys, monkeypatch))
    listed = named(section("Records"))
    kept = set(record) | set(record["inputs"])
    for entry in (record["hypotheses"][0], record["comparisons"][0]):
        kept |= set(entry)
        kept |= {key for part in entry.values() if isinstance(part, dict) for key in part}
        kept |= {key for part in entry.values() if isinstance(part, list) for one in part[:1] for key in one}
    assert kept - listed == set()


def test_every_name_and_every_link_is_there() -> None:
    for name in re.findall(r"\bwb\.([A-Za-z_]+)", README):
        assert hasattr(workbench, name), name
    for target in re.findall(r"\]\(([^)#]+)\)", README):
        assert (ROOT / target.strip()).exists(), target
    anchors = {
        "#" + re.sub(r"[^\w -]", "", title.lower()).replace(" ", "-")
        for title in re.findall(r"^#+ (.*)$", README, re.MULTILINE)
    }
    assert set(re.findall(r"\]\((#[^)]+)\)", README)) <= anchors
