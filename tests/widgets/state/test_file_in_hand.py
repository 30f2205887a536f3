"""What is in hand is opened from files and saved to them, and nobody's work is lost on the way."""

from __future__ import annotations

from pathlib import Path

import pytest

import workbench as wb
from tests.analyses import counting
from workbench.widgets.state.editing import Editing
from workbench.widgets.state.edits import Edit, HeldParameter, PriorProbability
from workbench.widgets.state.file_in_hand import OPEN, SAVE, FileInHand
from workbench.widgets.state.row_edits import RowAdded, RowRemoved
from workbench.widgets.state.rows import Row

SKERRY = Path(__file__).parents[3] / "data" / "skerry"
EDIT = PriorProbability("resonance", 0.25)


@pytest.fixture
def file(tmp_path: Path) -> FileInHand:
    for name in ("skerry.toml", "skerry-peak.csv"):
        (tmp_path / name).write_bytes((SKERRY / name).read_bytes())
    made = FileInHand(Editing())
    assert made.open(str(tmp_path / "skerry.toml"))
    return made


def test_one_edit_changes_one_line_of_the_file(file: FileInHand) -> None:
    path = Path(file.name)
    before = path.read_text().splitlines()
    assert file.editing.edit(EDIT)
    assert file.editing.is_dirty
    assert file.save()
    after = path.read_text().splitlines()
    assert [(a, b) for a, b in zip(before, after, strict=True) if a != b] == [("prior = 0.5", "prior = 0.25")]
    assert [file.editing.is_dirty, file.editing.undo(), file.editing.is_dirty] == [False, True, True]
    assert file.save()
    assert path.read_text().splitlines() == before


def test_a_copy_elsewhere_keeps_the_comments_and_finds_its_tables(file: FileInHand, tmp_path: Path) -> None:
    (tmp_path / "elsewhere").mkdir()
    copy = tmp_path / "elsewhere" / "copy.toml"
    file.editing.edit(EDIT)
    assert file.save(str(copy))
    assert file.name == str(copy)
    assert "# A narrow resonance on a falling spectrum" in copy.read_text()
    assert wb.read_analysis(copy) == file.editing.analysis
    assert file.save()


def test_what_somebody_else_wrote_meanwhile_is_not_lost(file: FileInHand) -> None:
    path = Path(file.name)
    path.write_text(path.read_text() + "# mine\n")
    file.editing.edit(EDIT)
    assert not file.save()
    (problem,) = file.editing.problems_at(SAVE)
    assert problem.what == "A file that was changed since it was read"
    assert file.editing.is_dirty
    assert file.save(replaces=True)
    assert path.read_text().endswith("# mine\n")
    assert file.editing.problems_at(SAVE) == ()


def test_a_file_that_was_broken_meanwhile_can_still_be_saved_over(file: FileInHand) -> None:
    Path(file.name).write_text("[[[")
    file.editing.edit(EDIT)
    assert file.save(replaces=True)
    assert wb.read_analysis(file.name) == file.editing.analysis


@pytest.mark.parametrize(
    ("name", "what"),
    [
        ("skerry-peak.csv", "A name that no analysis file has"),
        ("", "A name that no analysis file has"),
        ("nul\0.toml", "A name that no analysis file has"),
        ("taken.toml", "File exists already"),
        ("no folder/new.toml", "File can't be written"),
    ],
)
def test_a_file_that_cannot_be_written_says_so_under_its_control(
    file: FileInHand, tmp_path: Path, name: str, what: str
) -> None:
    (tmp_path / "taken.toml").write_text("format = 1\n")
    if not name:
        file.hold(counting(3.0, 2.0))
    assert not file.save(str(tmp_path / name) if name else "")
    assert [one.what for one in file.editing.problems_at(SAVE)] == [what]
    assert (tmp_path / "taken.toml").read_text() == "format = 1\n"


def test_unsaved_changes_are_not_lost_by_opening(file: FileInHand) -> None:
    name = file.name
    file.editing.edit(EDIT)
    changed = file.editing.analysis
    assert not file.open(name)
    assert file.editing.analysis is changed
    assert [one.what for one in file.editing.problems_at(OPEN)] == ["Changes that are not saved"]
    assert file.open(name, loses_changes=True)
    assert file.editing.refusals == ()
    assert file.editing.analysis != changed


@pytest.mark.parametrize(
    ("name", "content", "what"),
    [
        ("missing.toml", None, "File not found"),
        ("broken.toml", "format = 1\n[[[", "A text that is not TOML"),
        ("odd.xls", "x", "A kind of file that is not read"),
        ("bare.csv", "low,high,observed,b\n0,1,3,2.0\n", "A histogram without a signal column"),
    ],
)
def test_a_file_that_cannot_be_read_leaves_what_is_in_hand(
    file: FileInHand, tmp_path: Path, name: str, content: str | None, what: str
) -> None:
    before, own = file.editing.analysis, file.name
    if content is not None:
        (tmp_path / name).write_text(content)
    assert not file.open(str(tmp_path / name))
    assert [one.what for one in file.editing.problems_at(OPEN)] == [what]
    assert (file.editing.analysis, file.name) == (before, own)


def test_a_histogram_alone_becomes_an_analysis_that_can_be_saved(file: FileInHand, tmp_path: Path) -> None:
    path = tmp_path / "counts.csv"
    path.write_text("low,high,observed,falling,signal\n0,1,3,2.0,1\n1,2,0,1.0,0.5\n")
    assert file.open(str(path))
    assert not file.editing.is_dirty
    assert not file.save()
    assert file.save(str(tmp_path / "counts.toml"))
    assert wb.read_analysis(tmp_path / "counts.toml") == file.editing.analysis
    assert 'table = "counts.csv"' in (tmp_path / "counts.toml").read_text()


LAID_OUT_OTHERWISE = """# the head
format = 1
title = "Otherwise"
[regions.only] # here
edges = [0, 1, 2]
observed = [3, 4]
[parameters]
strength.prior.uniform = { low = 0, high = 5 } # any
[processes]
b = { kind = "background", regions.only = { yield = 5, shape = { uniform = {} } } }
s = { kind = "signal", factors = ["strength"], regions.only = { yield = 2, shape = { uniform = {} } } } # s
"""


def test_a_file_laid_out_otherwise_keeps_its_comments_through_edits_and_undoing(tmp_path: Path) -> None:
    """A row that came back in front of others of its source once made the whole file lose its comments."""
    path = tmp_path / "otherwise.toml"
    path.write_text(LAID_OUT_OTHERWISE)
    file = FileInHand(Editing())
    assert file.open(str(path))
    first = file.editing.analysis
    edits: list[Edit] = [
        RowAdded(Row("size", "b", 0.1)),
        RowAdded(Row("size", "s", 0.2, -0.1)),
        RowRemoved(Row("size", "b", 0.1)),
        PriorProbability("signal plus background", 3.0),
        HeldParameter("signal plus background", "strength", 1.0),
    ]

    def save() -> None:
        assert file.save(), file.editing.refusals
        assert wb.read_analysis(path) == file.editing.analysis
        text = path.read_text()
        assert [one for one in ("# the head", "# here", "# any", "} } } # s") if one not in text] == []

    for edit in edits:
        assert file.editing.edit(edit), file.editing.refusals
        save()
    while file.editing.undo():
        save()
    assert file.editing.analysis == first
    assert "fix" not in path.read_text()
