"""What a CSV or TSV file says is what the table holds; what is refused is kept in tests/bad/."""

from __future__ import annotations

import hashlib
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from workbench.counts.csv_table import read_csv_table
from workbench.counts.table import Table
from workbench.errors import InputError

PLAIN = "low,high,observed,fakes,fakes error\n0,1,12,3.5,0.25\n1,2.5,9,1e-1,0\n"


def table_of(folder: Path, content: str | bytes, name: str = "counts.csv") -> Table:
    path = folder / name
    path.write_bytes(content.encode() if isinstance(content, str) else content)
    return read_csv_table(path, name)


def content(table: Table) -> list[list[float]]:
    assert table.observed is not None
    return [
        values.tolist()
        for values in (
            table.binning.low,
            table.binning.high,
            table.observed,
            *table.columns.values(),
            *table.errors.values(),
        )
    ]


EXPECTED = [[0.0, 1.0], [1.0, 2.5], [12.0, 9.0], [3.5, 0.1], [0.25, 0.0]]


def test_a_plain_file_is_read_as_it_says(tmp_path: Path) -> None:
    table = table_of(tmp_path, PLAIN)
    assert content(table) == EXPECTED
    assert (list(table.columns), list(table.errors)) == (["fakes"], ["fakes"])
    assert (table.source, table.lines) == ("counts.csv", (2, 3))
    assert table.digest == "sha256:" + hashlib.sha256(PLAIN.encode()).hexdigest()


@pytest.mark.parametrize(
    "dressed",
    [
        PLAIN.replace("\n", "\r\n"),
        PLAIN.replace("\n", "\r"),
        "\ufeff" + PLAIN,
        PLAIN.replace(",", " , ").replace("\n", "  \n"),
        "# made by hand\n\n" + PLAIN.replace("\n", "\n\n  # between\n"),
        PLAIN.rstrip("\n"),
        PLAIN.replace("fakes error", '"fakes error"').replace("12", '"12"').replace("3.5", "+3.50E+0"),
        "fakes error,observed,fakes,high,low\n0.25,12,3.5,1,0\n0,9,.1,2.5,1.\n",
    ],
    ids=[
        "windows",
        "old-mac",
        "byte-order-mark",
        "spaces",
        "comments",
        "no-last-line-end",
        "quotes",
        "other-order",
    ],
)
def test_the_dress_of_a_file_does_not_matter(dressed: str, tmp_path: Path) -> None:
    assert content(table_of(tmp_path, dressed)) == EXPECTED


def test_tabs_separate_cells_in_a_file_of_tabs_whatever_its_name(tmp_path: Path) -> None:
    tabs = PLAIN.replace(",", "\t")
    assert content(table_of(tmp_path, tabs, "counts.tsv")) == EXPECTED
    assert content(table_of(tmp_path, tabs, "counts.csv")) == EXPECTED
    assert content(table_of(tmp_path, PLAIN, "counts.tsv")) == EXPECTED


def test_a_name_may_hold_a_comma_where_it_is_quoted(tmp_path: Path) -> None:
    table = table_of(tmp_path, 'low,high,observed,"fakes, hard"\n0,1,2,3\n')
    assert list(table.columns) == ["fakes, hard"]


def test_lines_are_those_of_the_file_comments_counted(tmp_path: Path) -> None:
    assert table_of(tmp_path, "# one\nlow,high,observed\n\n0,1,2\n# five\n1,2,3\n").lines == (4, 6)


def test_a_file_without_observed_counts_is_for_planning(tmp_path: Path) -> None:
    assert table_of(tmp_path, "low,high,background\n0,1,12.5\n").observed is None


def test_negative_templates_are_left_to_the_region(tmp_path: Path) -> None:
    assert table_of(tmp_path, "low,high,fakes\n0,1,-2.5\n").columns["fakes"].tolist() == [-2.5]


@pytest.mark.parametrize("count", ["0", "1000000000000000", "1e15", "12.0", "9007199254740991"])
def test_whole_numbers_are_counts_however_they_are_written(count: str, tmp_path: Path) -> None:
    observed = table_of(tmp_path, f"low,high,observed\n0,1,{count}\n").observed
    assert observed is not None
    assert int(observed[0]) == (int(count) if count.isdigit() else int(float(count)))


def test_a_file_that_is_not_there_is_named_with_its_neighbour(tmp_path: Path) -> None:
    table_of(tmp_path, PLAIN)
    with pytest.raises(InputError) as caught:
        read_csv_table(tmp_path / "conuts.csv", "conuts.csv")
    (problem,) = caught.value.problems
    assert problem.text() == (
        "File not found\n"
        "  where     conuts.csv\n"
        "  found     no such file\n"
        "  expected  a file that exists\n"
        '  try       use "counts.csv", which is there'
    )


def test_a_folder_is_no_file(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="A folder where a file is needed"):
        read_csv_table(tmp_path)


@given(edits=st.lists(st.tuples(st.integers(0, len(PLAIN)), st.binary(max_size=3)), min_size=1, max_size=4))
def test_whatever_a_file_holds_it_is_read_or_refused(
    edits: list[tuple[int, bytes]], tmp_path_factory: pytest.TempPathFactory
) -> None:
    data = bytearray(PLAIN.encode())
    for place, splice in edits:
        data[place : place + 1] = splice
    try:
        outcome: Table | InputError = table_of(tmp_path_factory.getbasetemp(), bytes(data))
    except InputError as refusal:
        outcome = refusal
    if isinstance(outcome, Table):
        assert outcome.binning.number >= 1
    else:
        assert outcome.problems
        assert all(problem.text().count("\n") == 4 for problem in outcome.problems)
