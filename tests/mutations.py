"""Hostile edits of valid files: lines deleted, doubled and swapped, values replaced, keys misspelt, noise."""

from __future__ import annotations

import re
import shutil
from collections.abc import Iterable
from pathlib import Path

from hypothesis import strategies as st

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


def tables_beside(folder: Path, files: Iterable[Path]) -> Path:
    """Copy every table that stands beside the given files into a folder, and return it."""
    for file in files:
        for table in file.parent.glob("*.csv"):
            shutil.copy(table, folder)
    return folder
