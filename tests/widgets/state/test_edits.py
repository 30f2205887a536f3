"""Every edit of the bench gives an analysis that its file gives back, or problems and no change.

The expectations are the files themselves: what is saved is read again by the reader of the command line.
"""

from __future__ import annotations

import math
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

import workbench as wb
from tests.analyses import everything
from tests.mutations import tables_beside
from workbench.hypotheses.priors import FAMILIES, Prior
from workbench.widgets.state.editing import Editing
from workbench.widgets.state.edits import (
    Edit,
    ExposureUncertainty,
    HeldParameter,
    PriorProbability,
    ProcessOfHypothesis,
)
from workbench.widgets.state.file_in_hand import FileInHand
from workbench.widgets.state.prior_edits import PriorOfParameter, in_family, numbers_of, numbers_of_family
from workbench.widgets.state.row_edits import RowAdded, RowChanged, RowRemoved, SourceRenamed
from workbench.widgets.state.rows import Row, rows_of

ROOT = Path(__file__).parents[3]
FILES = [
    *(ROOT / "tests" / "hypotheses" / "files" / f"{name}.toml" for name in ("everything", "alternatives")),
    *sorted((ROOT / "data").glob("*/*.toml")),
]
SIZES: st.SearchStrategy[float | str] = st.sampled_from(
    [0.1, 0.07, -0.2, 1.5, 0.0, 3, -1.0, -2.0, math.inf, math.nan, 1e200, "fakes hard"]
)
NUMBERS: st.SearchStrategy[float] = st.sampled_from(
    [0.5, 1.0, 2.5, 40.0, 45, 1e-3, 0.0, -3.0, math.inf, -math.inf, math.nan, 1e250]
)
NAMES = st.sampled_from(["new", 'odd "name" = [1] # no', "exposure", "strength", "", "ν\u2028", "a.b"])


@st.composite
def edits_of(draw: st.DrawFn, analysis: wb.Analysis) -> Edit:
    """Draw any edit that a control could ask for, sensible or not."""
    hypothesis = draw(st.sampled_from([one.name for one in analysis.hypotheses]))
    process = draw(st.sampled_from([one.name for one in analysis.processes]))
    parameter = draw(st.sampled_from(analysis.parameters))
    match draw(st.integers(0, 8)):
        case 0:
            return ProcessOfHypothesis(hypothesis, process, draw(st.booleans()))
        case 1:
            return PriorProbability(hypothesis, draw(NUMBERS))
        case 2:
            return HeldParameter(hypothesis, parameter.name, draw(st.none() | NUMBERS))
        case 3:
            return ExposureUncertainty(draw(st.none() | NUMBERS))
        case 4 | 5:
            prior = in_family(parameter.prior, draw(st.sampled_from([parameter.prior.family, *FAMILIES])))
            edit = PriorOfParameter(parameter.name, prior.family, numbers_of(prior))
            number = draw(st.sampled_from([*numbers_of_family(prior.family)]))
            return edit.with_number(number.name, draw(NUMBERS)) if draw(st.booleans()) else edit
    return draw(row_edits_of(analysis, process))


@st.composite
def row_edits_of(draw: st.DrawFn, analysis: wb.Analysis, process: str) -> Edit:
    """Draw any edit of the list of uncertainties."""
    old = draw(st.sampled_from(rows_of(analysis) or (Row("gone", "gone", 0.1),)))
    is_hostile = draw(st.integers(0, 3)) == 0
    sizes = SIZES if is_hostile else st.sampled_from([0.1, 0.07, -0.2, 1.5])
    names = analysis.process(process).region_names
    if is_hostile:
        names = (*(one.name for one in analysis.regions), "no region")
    limited = draw(
        st.none() | st.lists(st.sampled_from(names), min_size=not is_hostile, unique=True).map(tuple)
    )
    up, down = draw(sizes), draw(st.none() | sizes)
    row = Row(
        draw(NAMES if is_hostile else st.sampled_from(["new", "newer", old.source])),
        process,
        up,
        down,
        limited,
    )
    same_pair = Row(old.source, old.process, up, down, draw(st.sampled_from([limited, old.regions, None])))
    edits: list[Edit] = [
        RowAdded(row),
        RowChanged(old, row),
        RowChanged(old, same_pair),
        RowRemoved(old),
        SourceRenamed(old.source, row.source),
    ]
    return draw(st.sampled_from(edits))


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Return a folder with the tables of every file."""
    return tables_beside(tmp_path_factory.mktemp("edits"), FILES)


@given(st.integers(0, len(FILES) - 1), st.data())
@settings(
    max_examples=400,
    deadline=None,
    derandomize=True,
    suppress_health_check=[HealthCheck.function_scoped_fixture, HealthCheck.too_slow],
)
def test_whatever_is_edited_is_saved_with_its_comments_read_back_undone_and_redone(
    folder: Path, which: int, data: st.DataObject
) -> None:
    original = FILES[which].read_text(encoding="utf-8")
    path = folder / "edited.toml"
    path.write_text(original, encoding="utf-8")
    editing = Editing()
    file = FileInHand(editing)
    assert file.open(str(path))
    first = editing.analysis
    assert first is not None
    for _ in range(data.draw(st.integers(1, 5))):
        before = editing.analysis
        assert before is not None
        edit = data.draw(edits_of(before))
        if not editing.edit(edit):
            assert editing.analysis is before
            for problem in editing.problems_at(edit.control):
                lines = problem.text().split("\n")
                assert len(lines) == 5
                assert all(line.strip() for line in lines)
            assert editing.problems_at(edit.control)
    last = editing.analysis
    assert last is not None
    assert editing.is_dirty == (last != first)
    assert file.save(), editing.refusals
    assert not editing.is_dirty
    assert wb.read_analysis(path) == last
    assert path.read_text(encoding="utf-8").split("\n")[0] == original.split("\n")[0]  # a comment
    while editing.undo():
        pass
    assert editing.analysis == first
    assert file.save(), editing.refusals
    assert wb.read_analysis(path) == first
    assert path.read_text(encoding="utf-8").split("\n")[0] == original.split("\n")[0]
    while editing.redo():
        pass
    assert editing.analysis == last


def test_every_kind_of_edit_is_also_accepted(folder: Path) -> None:
    """A property that refuses everything would hold too."""
    editing = Editing(wb.read_analysis(FILES[0].with_name("everything.toml")))
    assert editing.analysis is not None
    row = rows_of(editing.analysis)[0]
    signal = next(one.name for one in editing.analysis.processes if one.is_signal)
    first, second = (one.name for one in editing.analysis.hypotheses[:2])
    edits: list[Edit] = [
        ProcessOfHypothesis(first, signal, is_in=True),
        PriorProbability(second, 3.0),
        HeldParameter(second, "strength", 1.0),
        ExposureUncertainty(0.05),
        PriorOfParameter("mass", "normal", {"mean": 45.0, "sd": 2.0, "low": 20.0, "high": 80.0}),
        RowChanged(row, Row(row.source, row.process, 0.5, -0.25)),
        RowRemoved(Row(row.source, row.process, 0.5, -0.25)),
        RowAdded(Row("a new one", row.process, 0.02)),
        SourceRenamed("a new one", "another name"),
    ]
    for edit in edits:
        before = editing.analysis
        assert editing.edit(edit), editing.refusals
        assert editing.analysis != before, edit
        assert editing.undo_words == edit.words


def test_a_process_comes_back_to_its_place() -> None:
    editing = Editing(wb.read_analysis(ROOT / "data" / "skerry" / "skerry.toml"))
    first = editing.analysis
    assert first is not None
    assert editing.edit(ProcessOfHypothesis("resonance", "fakes", is_in=False))
    assert editing.analysis is not None
    assert editing.analysis.hypothesis("resonance").processes == ("continuum", "resonance")
    assert editing.edit(ProcessOfHypothesis("resonance", "fakes", is_in=True))
    assert editing.analysis == first
    assert not editing.is_dirty


def test_one_row_stands_for_each_source_and_process_and_none_for_no_effect() -> None:
    region = wb.Region("only", wb.Table(wb.Binning([0.0], [1.0]), [3.0]))
    other = wb.Region("other", wb.Table(wb.Binning([0.0], [1.0]), [3.0]))
    flat = {"only": wb.Contribution(wb.Flat(), 3.0), "other": wb.Contribution(wb.Flat(), 3.0)}
    analysis = wb.Analysis(
        "Rows",
        (region, other),
        (wb.Parameter("strength", wb.Uniform(0.0, 5.0)),),
        (wb.Process("b", "background", flat), wb.Process("s", "signal", flat, ("strength",))),
        (
            wb.Uncertainty("both", (wb.Effect("b", 0.1), wb.Effect("s", 0.0))),
            wb.Uncertainty(
                "split", (wb.Effect("b", 0.1, None, ("only",)), wb.Effect("b", 0.1, None, ("other",)))
            ),
            wb.Uncertainty("there", (wb.Effect("b", 0.2, -0.1),), ("other",)),
        ),
    )
    assert rows_of(analysis) == (
        Row("both", "b", 0.1),
        Row("split", "b", 0.1, None, ("only", "other")),
        Row("there", "b", 0.2, -0.1, ("other",)),
    )
    wider = RowChanged(rows_of(analysis)[2], Row("there", "b", 0.2, -0.1)).made(analysis)
    assert wider.uncertainty("there") == wb.Uncertainty("there", (wb.Effect("b", 0.2, -0.1),))
    nothing = RowChanged(rows_of(analysis)[0], Row("both", "b", 0.0)).made(analysis)
    assert rows_of(nothing)[0].source == "split"


def test_a_source_that_reaches_further_leaves_its_other_rows_where_they_were() -> None:
    analysis = everything()
    row = next(one for one in rows_of(analysis) if one.source == "yield of all" and one.process == "moving")
    wider = RowAdded(Row("yield of all", "soft", 0.1)).made(analysis)
    assert row in rows_of(wider)
    assert Row("yield of all", "soft", 0.1) in rows_of(wider)


@pytest.mark.parametrize("family", FAMILIES)
@pytest.mark.parametrize("prior", [one.prior for one in everything().parameters], ids=lambda one: one.family)
def test_another_family_begins_where_the_last_one_was(prior: Prior, family: str) -> None:
    """By moments: a family that can have both has the old mean within a standard deviation."""
    made = in_family(prior, family)
    assert made.family == family
    assert numbers_of(made).keys() <= {one.name for one in numbers_of_family(family)}
    spread = max(prior.moments.sd, made.moments.sd, 0.01 * abs(prior.moments.mean))
    assert abs(made.moments.mean - prior.moments.mean) <= spread


@pytest.mark.parametrize("family", FAMILIES)
@pytest.mark.parametrize(
    "prior",
    [
        wb.Normal(-3.0, 1.0),
        wb.Uniform(-5.0, -4.0),
        wb.Fixed(0.0),
        wb.Uniform(1e6, 1e6 + 1e-3),
        wb.Normal(0.0, 2.0),
    ],
)
def test_every_family_can_follow_numbers_that_it_cannot_hold(prior: Prior, family: str) -> None:
    assert in_family(prior, family).family == family
