"""What is shown of a loaded file before anything is computed; the truth is counted by hand."""

from __future__ import annotations

from pathlib import Path

import numpy as np

import workbench as wb
from workbench.hypotheses.bare import analysis_from_table
from workbench.records.understanding import Column, understood

DATA = Path(__file__).parents[2] / "data"
COUNTS = """low,high,observed,falling,falling error,falling hard,signal
0,1,3,2.0,0.1,2.5,1
1,2,0,1.0,0.1,0.5,0.5
3,4,1,0.5,0.1,0.25,0
4,5,0,0.5,0.1,0.25,0
"""


def test_a_histogram_alone_is_shown_column_by_column(tmp_path: Path) -> None:
    path = tmp_path / "counts.csv"
    path.write_text(COUNTS)
    (found,) = understood(analysis_from_table(wb.read_csv_table(path, "counts.csv")))
    assert (found.source, found.bins, found.first_edge, found.last_edge) == ("counts.csv", 4, 0.0, 5.0)
    assert (found.observed, found.empty_bins, found.single_count_bins) == (4, 2, 1)
    assert found.has_gaps
    assert found.template_errors
    template = "a template's expected events"
    assert found.columns == (
        Column("low", "the bin's lower edge"),
        Column("high", "the bin's upper edge"),
        Column("observed", "observed counts", 4.0),
        Column("falling", template, 4.0, ("falling",)),
        Column("falling hard", template, 3.5, ("falling hard",)),
        Column("signal", template, 1.5, ("signal",)),
        Column("falling error", "the error of falling, which enters the likelihood"),
    )


def test_an_analysis_says_who_uses_each_column_and_which_nobody_does() -> None:
    analysis = wb.read_analysis(DATA / "skerry" / "skerry.toml")
    (found,) = understood(analysis)
    uses = {one.name: one.used_by for one in found.templates}
    assert uses["fakes"] == ("fakes",)
    assert uses["fakes hard"] == ("fake composition (up)",)
    assert not found.has_gaps
    raw = np.genfromtxt(DATA / "skerry" / "skerry-peak.csv", delimiter=",", names=True)
    assert found.observed == raw["observed"].sum()
    assert found.empty_bins == (raw["observed"] == 0).sum()


def test_errors_that_are_left_out_and_counts_that_are_not_there_are_said(tmp_path: Path) -> None:
    path = tmp_path / "counts.csv"
    path.write_text("low,high,b,b error,idle\n0,1,2.0,0.1,1.0\n")
    analysis = wb.Analysis(
        "Planning",
        (wb.Region("only", wb.read_csv_table(path, "counts.csv")),),
        processes=(wb.Process("b", "background", {"only": wb.Contribution(wb.Template("b"))}),),
    )
    (found,) = understood(analysis)
    assert (found.observed, found.empty_bins, found.single_count_bins) == (None, None, None)
    assert found.columns[-1] == Column("b error", "the error of b, which is not used")
    assert [one.used_by for one in found.templates] == [("b",), ()]
