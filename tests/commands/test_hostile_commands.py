"""Whatever a file holds, a command answers, says what it could not establish, or refuses: never a traceback.

The files are the small demonstrations, with numbers at the ends of what is read, other priors, other names,
lines lost or exchanged. Warnings are errors here, so that one of numpy's would end as a fault of ours.
"""

from __future__ import annotations

import json
import os
import re
import signal
import subprocess
import sys
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from tests.mutations import edited, edits, tables_beside
from workbench.commands.main import main

ROOT = Path(__file__).parents[2]
FILES = [
    ROOT / "data" / "sorrel" / "sorrel.toml",
    ROOT / "data" / "tarn" / "tarn.toml",
    ROOT / "data" / "skerry" / "skerry-fixed-mass.toml",
    ROOT / "data" / "dunlin" / "dunlin.toml",
    ROOT / "data" / "skerry" / "counts.csv",
]
NUMBER = re.compile(r'(?<![\w."-])-?\d+(?:\.\d+)?(?:e-?\d+)?(?![\w"])')
PRIOR = re.compile(r"(?<=prior = )\{ \w+ = \{[^}]*\} \}")
SIZES = [
    "0",
    "-1",
    "1",
    "0.5",
    "-0.999",
    "7.5",
    "100",
    "1e5",
    "1e9",
    "1e20",
    "1e50",
    "1e99",
    "1e100",
    "1e300",
]
SIZES += ["-1e99", "9007199254740991", "1e-3", "1e-9", "1e-20", "1e-50", "1e-99", "1e-100", "1e-300"]
PRIORS = [
    "{{ uniform = {{ low = {0}, high = {1} }} }}",
    "{{ loguniform = {{ low = {0}, high = {1} }} }}",
    "{{ normal = {{ mean = {0}, sd = {1} }} }}",
    "{{ normal = {{ mean = {0}, sd = {1}, low = 0 }} }}",
    "{{ lognormal = {{ median = {0}, factor = {1} }} }}",
    "{{ gamma = {{ shape = {0}, rate = {1} }} }}",
    "{{ exponential = {{ mean = {0} }} }}",
    "{{ halfnormal = {{ sd = {0} }} }}",
    "{{ beta = {{ a = {0}, b = {1} }} }}",
    "{{ fixed = {{ value = {0} }} }}",
]

places = st.floats(0, 1, exclude_max=True)
sizes = st.sampled_from(SIZES)
numbers = st.tuples(st.just(NUMBER), places, sizes)
priors = st.tuples(st.just(PRIOR), places, st.builds(str.format, st.sampled_from(PRIORS), sizes, sizes))
changes = st.one_of(
    st.lists(numbers, min_size=1, max_size=2),
    st.lists(numbers, min_size=1, max_size=2),
    st.lists(priors, min_size=1, max_size=2),
    st.lists(edits, min_size=1, max_size=2),
)


def replaced(text: str, pattern: re.Pattern[str], place: float, new: str) -> str:
    """Return a text with one of a pattern's matches below the first line replaced."""
    matches = list(pattern.finditer(text, text.index("\n")))
    if not matches:
        return text
    start, end = matches[int(place * len(matches))].span()
    return text[:start] + new + text[end:]


def mutated(data: bytes, made: list[tuple[object, ...]]) -> bytes:
    """Return a file's bytes after some changes."""
    for change in made:
        pattern, place, new = change
        if isinstance(pattern, re.Pattern) and isinstance(place, float):
            data = replaced(data.decode("utf-8", "replace") + "\n", pattern, place, str(new)).encode()
        else:
            data = edited(data, change)
    return data


def hostile_file(folder: Path, which: int, made: list[tuple[object, ...]]) -> Path:
    """Write one of the valid files after some changes beside the tables."""
    path = folder / f"hostile{FILES[which].suffix}"
    path.write_bytes(mutated(FILES[which].read_bytes(), made))
    return path


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Return a folder with every table of the demonstrations."""
    return tables_beside(tmp_path_factory.mktemp("hostile"), FILES)


def answer(capsys: pytest.CaptureFixture[str], words: list[str]) -> tuple[int, str]:
    """Run a command, hold it to a calm ending, and return its exit code and standard output."""
    code = main(words)
    said = capsys.readouterr()
    assert code in {0, 1, 2}, said.err
    assert "Traceback" not in said.err
    assert "Warning" not in said.err
    assert (said.out == "") == (code == 2)
    return code, said.out


def refuse_constant(text: str) -> None:
    """Refuse what JSON does not know."""
    raise AssertionError(f"{text} in a record")


def end_calmly(capsys: pytest.CaptureFixture[str], words: list[str], *, as_json: bool) -> None:
    """Hold a command to a calm ending, and to a record of its own where it gives one."""
    code, out = answer(capsys, words + ["--json"] * as_json)
    if as_json and code < 2:
        assert json.loads(out, parse_constant=refuse_constant)["command"] == words[0]


@given(st.integers(0, len(FILES) - 1), changes, st.booleans())
@settings(
    max_examples=110, derandomize=True, deadline=None, database=None, suppress_health_check=list(HealthCheck)
)
def test_weighing_a_mutated_file_ends_calmly(
    folder: Path,
    capsys: pytest.CaptureFixture[str],
    which: int,
    made: list[tuple[object, ...]],
    as_json: bool,
) -> None:
    words = ["weigh", str(hostile_file(folder, which, made)), "--pseudo-experiments", "200"]
    end_calmly(capsys, words, as_json=as_json)


@given(changes, st.booleans())
@settings(
    max_examples=40, derandomize=True, deadline=None, database=None, suppress_health_check=list(HealthCheck)
)
def test_comparing_backgrounds_of_a_mutated_file_ends_calmly(
    folder: Path, capsys: pytest.CaptureFixture[str], made: list[tuple[object, ...]], as_json: bool
) -> None:
    doubted = next(place for place, path in enumerate(FILES) if path.stem == "dunlin")
    words = ["backgrounds", str(hostile_file(folder, doubted, made))]
    end_calmly(capsys, words, as_json=as_json)


@given(st.integers(0, len(FILES) - 1), changes, st.booleans())
@settings(
    max_examples=40, derandomize=True, deadline=None, database=None, suppress_health_check=list(HealthCheck)
)
def test_examining_priors_of_a_mutated_file_ends_calmly(
    folder: Path,
    capsys: pytest.CaptureFixture[str],
    which: int,
    made: list[tuple[object, ...]],
    as_json: bool,
) -> None:
    words = ["priors", str(hostile_file(folder, which, made)), "--pseudo-experiments", "200"]
    end_calmly(capsys, words, as_json=as_json)


@given(st.integers(0, len(FILES) - 1), changes, st.booleans())
@settings(
    max_examples=30, derandomize=True, deadline=None, database=None, suppress_health_check=list(HealthCheck)
)
def test_taking_the_evidence_of_a_mutated_file_apart_ends_calmly(
    folder: Path,
    capsys: pytest.CaptureFixture[str],
    which: int,
    made: list[tuple[object, ...]],
    as_json: bool,
) -> None:
    words = ["ledger", str(hostile_file(folder, which, made)), "--orders", "2", "--pseudo-experiments", "200"]
    end_calmly(capsys, words, as_json=as_json)


@given(st.integers(0, len(FILES) - 1), changes, st.sampled_from(["check", "fit"]), st.booleans())
@settings(
    max_examples=110, derandomize=True, deadline=None, database=None, suppress_health_check=list(HealthCheck)
)
def test_checking_and_fitting_a_mutated_file_end_calmly(
    folder: Path,
    capsys: pytest.CaptureFixture[str],
    which: int,
    made: list[tuple[object, ...]],
    command: str,
    as_json: bool,
) -> None:
    words = [command, str(hostile_file(folder, which, made))]
    words += ["--pseudo-experiments", "200"] * (command == "check")
    end_calmly(capsys, words, as_json=as_json)


ONCE = {
    "an overflow told by numpy": (0, "check", {"yield = 6.0": "yield = 1e100"}, 0),
    "derivatives that are no numbers": (0, "fit", {"yield = 4.0": "yield = 1e50"}, 1),
    "a singular matrix": (
        2,
        "weigh",
        {"high = 5": "high = 1e50", "mean = 18, sd = 0.5": "mean = 18, sd = 1e-50"},
        None,
    ),
    "eigenvalues that did not converge": (
        2,
        "weigh",
        {"normal = { mean = 18, sd = 0.5 }": "gamma = { shape = 1e-3, rate = 1e5 }"},
        None,
    ),
    "estimates that differ by nan": (
        2,
        "weigh",
        {"normal = { mean = 18, sd = 0.5 }": "gamma = { shape = 1e-99, rate = 1e-100 }"},
        1,
    ),
    "the minimiser's remarks amid the record": (
        1,
        "fit",
        {
            "gamma = { shape = 2.0, rate = 0.8 }": "beta = { a = 100, b = 1e-100 }",
            "high = 1328": "high = 1e99",
        },
        0,
    ),
}


@pytest.mark.parametrize(("which", "command", "changed", "code"), ONCE.values(), ids=ONCE)
def test_what_once_ended_badly_ends_calmly(
    folder: Path,
    capsys: pytest.CaptureFixture[str],
    which: int,
    command: str,
    changed: dict[str, str],
    code: int | None,
) -> None:
    text = FILES[which].read_text(encoding="utf-8")
    for old, new in changed.items():
        assert old in text
        text = text.replace(old, new)
    path = folder / "once.toml"
    path.write_text(text, encoding="utf-8")
    ended, out = answer(capsys, [command, str(path), "--json"])
    assert json.loads(out, parse_constant=refuse_constant)["command"] == command
    assert code in {None, ended}
    _, screen = answer(capsys, [command, str(path)])
    assert re.search(r"\b(nan|inf)\b", screen) is None


def test_many_mutated_files_are_still_answered(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """The changes are not so coarse that everything is refused."""
    codes = [
        answer(capsys, ["fit", str(hostile_file(folder, 0, [(NUMBER, place / 12, "100")]))])[0]
        for place in range(12)
    ]
    assert 4 < sum(code < 2 for code in codes) < 12


def test_the_signal_of_the_keyboard_ends_a_weighing_with_one_word() -> None:
    """Interrupted amid the work, not before it: while pseudo-experiments are fitted."""
    code = (
        "import os, signal, sys\n"
        "signal.signal(signal.SIGINT, signal.default_int_handler)\n"  # ignored where the tests run unattended
        "from workbench.commands.main import main\n"
        "from workbench.ensembles import adequacy\n"
        "drawn = adequacy.pseudo_experiments\n"
        "def interrupted(*given, **more):\n"
        "    yield from drawn(*given, **more)\n"
        "    os.kill(os.getpid(), signal.SIGINT)\n"
        "adequacy.pseudo_experiments = interrupted\n"
        f"sys.exit(main(['weigh', {str(FILES[2])!r}]))\n"
    )
    environment = {**os.environ, "PYTHONPATH": str(ROOT)}
    ended = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, env=environment, timeout=60, check=False
    )
    assert (ended.returncode, ended.stdout, ended.stderr) == (128 + signal.SIGINT, "", "\nStopped.\n")
