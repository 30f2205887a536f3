"""Distortions in files and in Python: read, written back, refused in Python as in a file, and named."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest

import workbench as wb
from tests.analyses import background, region_of, signal
from workbench.hypotheses.shapes import Flat, Gaussian

TEXT = """\
format = 1
title = "Two regions at Whin"

[regions.peak]
edges = [0, 1, 2, 3]
observed = [4, 5, 6]
[regions.side]
edges = [0, 1, 2]
observed = [7, 8]

[processes.flat]
kind = "background"
[processes.flat.regions.peak]
yield = 15
shape = { uniform = {} }
[processes.flat.regions.side]
yield = 15
shape = { uniform = {} }

[hypotheses."background only"]
processes = ["flat"]
[hypotheses.neither]   # of the two
processes = ["flat"]
distortion = { size = 0.05, terms = 2, regions = ["peak"] }   # five per cent
"""


@pytest.fixture
def file(tmp_path: Path) -> Path:
    path = tmp_path / "whin.toml"
    path.write_text(TEXT, encoding="utf-8")
    return path


def with_distortion(analysis: wb.Analysis, distortion: wb.Distortion | None) -> wb.Analysis:
    first, second = analysis.hypotheses
    return replace(analysis, hypotheses=(first, replace(second, distortion=distortion)))


def test_a_file_says_what_python_says(file: Path) -> None:
    analysis = wb.read_analysis(file)
    assert analysis.hypotheses[0].distortion is None
    assert analysis.hypotheses[1].distortion == wb.Distortion(0.05, 2, ("peak",))
    assert analysis == with_distortion(analysis, wb.Distortion(0.05, 2, ("peak",)))
    assert analysis != with_distortion(analysis, wb.Distortion(0.06, 2, ("peak",)))
    assert analysis != with_distortion(analysis, None)


@pytest.mark.parametrize(
    ("distortion", "line"),
    [
        (wb.Distortion(0.1, 2, ("peak",)), "{ size = 0.1, terms = 2, regions = ["),
        (wb.Distortion(0.05, 1, ("side", "peak")), '{ size = 0.05, terms = 1, regions = ["side", "peak"]'),
        (wb.Distortion(0.05, 2), "{ size = 0.05, terms = 2"),
    ],
)
def test_a_changed_distortion_is_written_back_with_the_comments_of_the_rest(
    distortion: wb.Distortion, line: str, file: Path
) -> None:
    changed = with_distortion(wb.read_analysis(file), distortion)
    wb.write_analysis(changed, file, keep=file)
    assert wb.read_analysis(file) == changed
    text = file.read_text(encoding="utf-8")
    assert line in text
    assert "# of the two" in text
    assert "# five per cent" in text


def test_an_unchanged_file_stays_and_one_without_comments_is_read_back(file: Path, tmp_path: Path) -> None:
    analysis = wb.read_analysis(file)
    wb.write_analysis(analysis, file, keep=file)
    assert file.read_text(encoding="utf-8") == TEXT
    wb.write_analysis(analysis, tmp_path / "new.toml")
    assert wb.read_analysis(tmp_path / "new.toml") == analysis
    wb.write_analysis(with_distortion(analysis, None), file, keep=file)
    assert "distortion" not in file.read_text(encoding="utf-8")


def test_three_terms_are_meant_where_none_are_said(tmp_path: Path) -> None:
    path = tmp_path / "whin.toml"
    short = TEXT.replace("terms = 2, ", "")
    path.write_text(short, encoding="utf-8")
    analysis = wb.read_analysis(path)
    assert analysis.hypotheses[1].distortion == wb.Distortion(0.05, 3, ("peak",))
    wb.write_analysis(analysis, path, keep=path)
    assert path.read_text(encoding="utf-8") == short


def test_the_terms_are_sources_of_that_hypothesis_alone(file: Path) -> None:
    analysis = wb.read_analysis(file)
    assert analysis.sources_used("background only") == ()
    assert analysis.sources_used("neither") == ("distortion 1 in peak", "distortion 2 in peak")
    everywhere = with_distortion(analysis, wb.Distortion(0.05, 1))
    assert everywhere.sources_used("neither") == ("distortion 1 in peak", "distortion 1 in side")


def test_only_regions_with_a_background_are_distorted() -> None:
    regions = (region_of([0.0, 1, 2], [3, 4], name="main"), region_of([0.0, 1], [1], name="other"))
    analysis = wb.Analysis(
        "Signal alone in a region",
        regions,
        processes=(
            background("flat", Flat(), 5.0, region="main"),
            signal("line", Gaussian(0.5, 0.1), 5.0, region="other"),
        ),
        hypotheses=(
            wb.Hypothesis("background only", ("flat",)),
            wb.Hypothesis("neither", ("flat", "line"), distortion=wb.Distortion(0.05, 2)),
        ),
    )
    assert list(analysis.distorted_regions("neither")) == ["main"]


@pytest.mark.parametrize(
    "distortion",
    [
        wb.Distortion(float("nan")),
        wb.Distortion(float("inf")),
        wb.Distortion(0.0),
        wb.Distortion(0.05, 11, ("peak",)),
        wb.Distortion(0.05, True, ("peak",)),
        wb.Distortion(0.05, 3),  # the second region has two bins
    ],
)
def test_python_is_refused_what_a_file_is_refused(distortion: wb.Distortion, file: Path) -> None:
    with pytest.raises(wb.InputError):
        with_distortion(wb.read_analysis(file), distortion)


def test_a_first_hypothesis_that_is_distorted_is_warned_of(file: Path) -> None:
    analysis = wb.read_analysis(file)
    turned = replace(analysis, hypotheses=analysis.hypotheses[::-1])
    assert "first-hypothesis-distorted" in {caution.code for caution in turned.cautions}
    assert "first-hypothesis-distorted" not in {caution.code for caution in analysis.cautions}
