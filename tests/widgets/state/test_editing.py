"""The analysis in hand is never broken: refused edits leave problems, and undone ones leave nothing."""

from __future__ import annotations

from pathlib import Path

import pytest

import workbench as wb
from tests.analyses import counting
from workbench.widgets.state.editing import Editing
from workbench.widgets.state.edits import HeldParameter, PriorProbability, ProcessOfHypothesis
from workbench.widgets.state.prior_edits import PriorOfParameter
from workbench.widgets.state.row_edits import RowChanged, RowRemoved
from workbench.widgets.state.rows import Row, rows_of

SKERRY = Path(__file__).parents[3] / "data" / "skerry" / "skerry.toml"
MASS = ("parameters", "mass", "prior")


@pytest.fixture
def editing() -> Editing:
    return Editing(wb.read_analysis(SKERRY))


def analysis_of(editing: Editing) -> wb.Analysis:
    assert editing.analysis is not None
    return editing.analysis


def test_a_refused_prior_says_what_the_terminal_says(editing: Editing, tmp_path: Path) -> None:
    """The reader of files, given the same numbers, is what it is compared with."""
    path = tmp_path / "skerry.toml"
    (tmp_path / "skerry-peak.csv").write_bytes(SKERRY.with_name("skerry-peak.csv").read_bytes())
    asked = [
        ("uniform", {"low": 80.0, "high": 20.0}),
        ("uniform", {"low": 20.0, "high": float("inf")}),
        ("normal", {"mean": 45.0}),
        ("flat", {"low": 20.0}),
        ("exponential", {"mean": -1.0}),
    ]
    for family, numbers in asked:
        before = analysis_of(editing)
        assert not editing.edit(PriorOfParameter("mass", family, numbers))
        assert editing.analysis is before
        written = ", ".join(f"{name} = {number}" for name, number in numbers.items())
        text = SKERRY.read_text().replace("uniform = { low = 20, high = 80 }", f"{family} = {{ {written} }}")
        path.write_text(text)
        with pytest.raises(wb.InputError) as caught:
            wb.read_analysis(path)
        told = [(one.what, one.found, one.expected, one.remedy) for one in caught.value.problems]
        shown = editing.problems_at(MASS)
        assert [(one.what, one.found, one.expected, one.remedy) for one in shown] == told
        assert all(one.where.startswith("parameters.mass.prior") for one in shown)


def test_both_ends_of_a_range_can_be_moved_past_each_other(editing: Editing) -> None:
    assert not editing.set_number_of_prior("mass", "low", 90.0)
    assert analysis_of(editing).parameter("mass").prior == wb.Uniform(20.0, 80.0)
    assert editing.asked_prior("mass").numbers["low"] == 90.0
    assert editing.problems_at(MASS)
    assert editing.set_number_of_prior("mass", "high", 100.0)
    assert analysis_of(editing).parameter("mass").prior == wb.Uniform(90.0, 100.0)
    assert editing.problems_at(MASS) == ()


def test_a_problem_of_one_number_is_found_at_that_number_too(editing: Editing) -> None:
    editing.set_number_of_prior("mass", "high", float("inf"))
    (problem,) = editing.problems_at((*MASS, "uniform", "high"))
    assert problem.what == "An improper prior"
    assert editing.problems_at((*MASS, "uniform", "low")) == ()
    assert editing.problems_at(("parameters", "strength", "prior")) == ()


def test_a_problem_found_elsewhere_stands_under_the_control_that_caused_it(editing: Editing) -> None:
    """A held parameter that nothing uses is wrong at `fix`, and the process that was taken out caused it."""
    assert editing.edit(HeldParameter("resonance", "mass", 45.0))
    out = ProcessOfHypothesis("resonance", "resonance", is_in=False)
    assert not editing.edit(out)
    (problem,) = editing.problems_at(out.control)
    assert problem.where == "hypotheses.resonance.fix.mass"


def test_a_refusal_goes_once_another_edit_has_made_it_possible(editing: Editing) -> None:
    assert editing.edit(HeldParameter("resonance", "mass", 45.0))
    out = ProcessOfHypothesis("resonance", "resonance", is_in=False)
    assert not editing.edit(out)
    assert editing.edit(PriorProbability("resonance", 2.0))
    assert editing.problems_at(out.control)
    assert editing.edit(HeldParameter("resonance", "mass", None))
    assert editing.problems_at(out.control) == ()
    assert "resonance" in analysis_of(editing).hypothesis("resonance").processes


def test_a_refusal_goes_with_the_row_that_it_was_about(editing: Editing) -> None:
    row = rows_of(analysis_of(editing))[0]
    assert not editing.edit(RowChanged(row, Row(row.source, row.process, -2.0)))
    assert editing.problems_at(row.control)[0].what == "An effect that takes away everything or more"
    assert editing.edit(RowRemoved(row))
    assert editing.refusals == ()
    assert not editing.edit(RowRemoved(row))
    assert editing.problems_at(row.control)[0].what == "A row that is no longer in the list"


def test_a_slider_that_moves_is_undone_in_one_step(editing: Editing) -> None:
    first = analysis_of(editing)
    assert editing.edit(PriorProbability("resonance", 2.0))
    editing.set_number_of_prior("strength", "high", 6.0)
    for high in (7.0, 8.0, 9.0):
        editing.set_number_of_prior("strength", "high", high, goes_on=True)
    assert editing.undo_words == "the prior of strength"
    assert editing.undo()
    assert analysis_of(editing).parameter("strength").prior == wb.Uniform(0.0, 5.0)
    assert (editing.undo_words, editing.redo_words) == (
        "the prior probability of resonance",
        "the prior of strength",
    )
    assert editing.redo()
    assert analysis_of(editing).parameter("strength").prior == wb.Uniform(0.0, 9.0)
    assert editing.undo()
    assert editing.undo()
    assert not editing.undo()
    assert analysis_of(editing) == first
    assert not editing.is_dirty


def test_a_new_edit_forgets_what_could_be_redone(editing: Editing) -> None:
    editing.edit(PriorProbability("resonance", 2.0))
    editing.undo()
    editing.edit(PriorProbability("resonance", 3.0))
    assert editing.redo_words == ""
    assert not editing.redo()


def test_an_edit_that_changes_nothing_is_no_step(editing: Editing) -> None:
    assert editing.edit(PriorProbability("resonance", 0.5))
    assert editing.undo_words == ""


def test_whoever_looks_at_one_trait_finds_the_others_right(editing: Editing) -> None:
    seen: list[tuple[str, bool, str]] = []

    def look(change: dict[str, object]) -> None:
        seen.append((str(change["name"]), editing.is_dirty, editing.undo_words))

    editing.observe(look)
    editing.edit(PriorProbability("resonance", 2.0))
    assert {name for name, _, _ in seen} == {"analysis", "is_dirty", "undo_words"}
    assert {(dirty, words) for _, dirty, words in seen} == {(True, "the prior probability of resonance")}


def test_another_analysis_in_hand_forgets_the_last_one(editing: Editing) -> None:
    editing.edit(PriorProbability("resonance", 2.0))
    editing.edit(PriorProbability("resonance", -2.0))
    editing.hold(counting(3.0, 2.0))
    assert (editing.refusals, editing.is_dirty, editing.undo_words) == ((), False, "")
    with pytest.raises(ValueError, match="no analysis"):
        Editing().edit(PriorProbability("resonance", 2.0))
