"""Whatever a file holds, reading it gives an analysis or an InputError, never anything else.

Two thousand files are made from valid ones by deleting, doubling and swapping lines, by replacing values, by
misspelling keys and by bytes that are noise. Warnings are errors here too.
"""

from __future__ import annotations

import re
import shutil
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from workbench.errors import InputError
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.reading import read_analysis
from workbench.hypotheses.writing import write_analysis

ROOT = Path(__file__).parents[2]
FILES = [
    Path(__file__).parent / "files" / "everything.toml",
    *(ROOT / "data" / name / f"{name}.toml" for name in ("skerry", "tarn", "sorrel")),
]
VALUE = re.compile(r'"[^"\n]*"|(?<![\w.-])[-+]?\d[\d.e-]*|\btrue\b|\bfalse\b')
KEY = re.compile(r"[A-Za-z_]{3,}(?=\s*=)|(?<=[\[.])[a-z]{3,}(?=[\].])")
HOSTILE = [
    *("nan", "inf", "-inf", "1e308", "-1e308", "1e-320", "0", "-0.0", "-1", "1", "2", "9007199254740993"),
    *("1" + "0" * 400, "0x" + "f" * 4500, "9" * 4500, "true", "1979-05-27T07:32:00Z", "07:32:00"),
    *('""', '" "', '"strength"', '"mass"', '"exposure"', '"\\u0000"', '"\\u202e\\n"', '"' + "x" * 3000 + '"'),
    *('"/etc/passwd"', '"../../../etc/passwd"', '"."'),
    *("[]", "[[]]", "{}", "[1, 2]", '["mass", "mass"]', "[nan]", "[true, {}]"),
    *("[" * 200 + "]" * 200, "[" * 3000),
    '{ parameter = "mass", at = [20, 80], values = [1, 1e308] }',
    '{ parameter = "mass", at = [80, 20], values = [] }',
    *('{ up = "fakes", down = "t20" }', "{ up = 1e308, down = -1 }", "{ regions = { peak = 0.1 } }"),
    *("{ normal = { mean = 1, sd = 1 } }", "{ normal = { mean = 0, sd = 1, low = 50 } }"),
    *("{ uniform = { low = -1e308, high = 1e308 } }", "{ loguniform = { low = 1e-308, high = 1e308 } }"),
    *("{ lognormal = { median = 1e300, factor = 1e300 } }", "{ gamma = { shape = 1e-300, rate = 1e300 } }"),
    *("{ beta = { a = 1e-9, b = 1e9 } }", "{ fixed = { value = 1e308 } }"),
]

places = st.floats(0, 1, exclude_max=True)
edits = st.one_of(
    st.tuples(st.just("delete"), places, st.integers(1, 4)),
    st.tuples(st.just("double"), places, places),
    st.tuples(st.just("swap"), places, places),
    st.tuples(st.just("value"), places, st.sampled_from(HOSTILE)),
    st.tuples(st.just("value"), places, st.sampled_from(HOSTILE)),
    st.tuples(
        st.just("rename"), places, st.sampled_from(["x", "", "..", " ", "Ω", "exposure", "regions", "yield"])
    ),
    st.tuples(st.just("noise"), places, st.binary(min_size=1, max_size=6)),
    st.tuples(st.just("cut"), places, st.integers(1, 60)),
)


def pick(matches: list[re.Match[bytes]], place: float) -> tuple[int, int]:
    """Return where one of the matches is; the start of the text without any."""
    return matches[int(place * len(matches))].span() if matches else (0, 0)


def edited(data: bytes, edit: tuple[object, ...]) -> bytes:
    """Return a file's bytes after one edit."""
    kind, place, argument = edit
    assert isinstance(place, float)
    lines = data.split(b"\n")
    line = int(place * len(lines))
    if kind == "delete" and isinstance(argument, int):
        del lines[line : line + argument]
        return b"\n".join(lines)
    if kind in {"double", "swap"} and isinstance(argument, float):
        other = int(argument * len(lines))
        if kind == "double":
            lines.insert(other, lines[line])
        else:
            lines[line], lines[other] = lines[other], lines[line]
        return b"\n".join(lines)
    start = end = int(place * len(data))
    new = argument if isinstance(argument, bytes) else str(argument).encode()
    if kind == "value":
        start, end = pick(list(re.finditer(VALUE.pattern.encode(), data)), place)
    elif kind == "rename":
        start, end = pick(list(re.finditer(KEY.pattern.encode(), data)), place)
    elif kind == "cut" and isinstance(argument, int):
        new, end = b"", start + argument
    return data[:start] + new + data[end:]


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
    made = tmp_path_factory.mktemp("hostile")
    for file in FILES:
        for table in file.parent.glob("*.csv"):
            shutil.copy(table, made)
    return made


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
