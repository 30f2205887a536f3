"""What is worth knowing about an analysis is told wherever the analysis came from, and once."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

import workbench as wb
from workbench.hypotheses.file.writing import write_analysis


def declared(template_errors: bool | None = None, down: float = 0.05) -> wb.Analysis:
    """Return an analysis with error columns, a bin below zero, a one-sided source, a number held far off."""
    table = wb.Table(
        wb.Binning.from_edges(np.array([0.0, 1.0, 2.0])),
        np.array([3.0, 1.0]),
        {"fakes": np.array([2.0, -0.5]), "bump": np.array([0.5, 1.0])},
        {"fakes": np.array([0.2, 0.1])},
        source="counts.csv",
    )
    region = wb.Region("peak", table, template_errors=template_errors, negative_templates="zero")
    return wb.Analysis(
        "Everything to be cautious about",
        (region,),
        (wb.Parameter("strength", wb.Uniform(0.0, 5.0)),),
        (
            wb.Process("fakes", "background", {"peak": wb.Contribution(wb.Template("fakes"))}),
            wb.Process("bump", "signal", {"peak": wb.Contribution(wb.Template("bump"))}, ("strength",)),
        ),
        (wb.Uncertainty("rate", (wb.Effect("fakes", 0.1, down),)),),
        (
            wb.Hypothesis("background only", ("fakes",)),
            wb.Hypothesis("both", ("fakes", "bump"), fix={"strength": 7.0}),
        ),
    )


def codes(analysis: wb.Analysis) -> list[str]:
    return [caution.code for caution in analysis.cautions]


EVERY = ["template-errors-unused", "negative-template-zeroed", "held-outside-prior", "one-sided-uncertainty"]


def test_an_analysis_made_in_python_has_its_cautions() -> None:
    """It had none, while its file had them all."""
    assert codes(declared()) == EVERY


def test_a_file_and_python_caution_alike(tmp_path: Path) -> None:
    path = tmp_path / "a.toml"
    write_analysis(declared(), path)
    read = wb.read_analysis(path)
    again = wb.Analysis(
        read.title, read.regions, read.parameters, read.processes, read.uncertainties, read.hypotheses
    )
    assert again.cautions == read.cautions
    assert codes(read) == [code for code in EVERY if code != "negative-template-zeroed"]  # zeros were written


def test_a_changed_analysis_has_the_cautions_of_the_change() -> None:
    analysis = declared()
    fewer = replace(analysis, uncertainties=(), hypotheses=())
    assert codes(fewer) == EVERY[:2]
    assert codes(replace(fewer, hypotheses=analysis.hypotheses)) == EVERY[:3]
    assert codes(replace(analysis)) == EVERY


@pytest.mark.parametrize("choice", [False, True])
def test_a_choice_about_template_errors_is_kept_by_the_file(choice: bool, tmp_path: Path) -> None:
    """A file left out that error columns are not to be used, so that reading it warned of them."""
    path = tmp_path / "a.toml"
    write_analysis(declared(choice, down=-0.05), path)
    again = wb.read_analysis(path)
    assert again.region("peak").template_errors is choice
    assert codes(again) == ["held-outside-prior"]


def test_leaving_template_errors_out_says_the_same_as_false_but_for_the_caution() -> None:
    assert declared() == declared(template_errors=False)
    assert declared() != declared(template_errors=True)
    assert codes(declared(template_errors=False)) == EVERY[1:]
