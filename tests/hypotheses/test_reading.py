"""Analysis files become analyses: what the design's example says, what is refused, what is cautioned about.

The expectations are worked out by hand from the contract of the file format.
"""

from __future__ import annotations

import os
from pathlib import Path

import numpy as np
import pytest

from workbench.errors import InputError
from workbench.hypotheses.analysis import Analysis, Exposure, Hypothesis
from workbench.hypotheses.file.lines import key_lines
from workbench.hypotheses.file.reading import analysis_from_text, read_analysis
from workbench.hypotheses.priors import Fixed, LogNormal, Normal, Uniform
from workbench.hypotheses.processes import Contribution
from workbench.hypotheses.quantities import Curve
from workbench.hypotheses.shapes import Bernstein, CrystalBall, Falling, Gaussian, Templates
from workbench.hypotheses.uncertainties import Effect, Uncertainty

EVERYTHING = Path(__file__).parent / "files" / "everything.toml"
LINE = """format = 1
title = "A line"
[regions.peak]
edges = [20, 40, 60, 80]
observed = [12, 7, 3]
[parameters.strength]
prior = { uniform = { low = 0, high = 5 } }
[parameters.mass]
prior = { uniform = { low = 30, high = 70 } }
[processes.continuum]
kind = "background"
[processes.continuum.regions.peak]
yield = 20
shape = { exponential = { scale = 18 } }
[processes.line]
kind = "signal"
factors = ["strength"]
[processes.line.regions.peak]
yield = 4
shape = { gaussian = { mean = "mass", sd = 1.2 } }
"""
TABLE = """low,high,observed,fakes,fakes error,hard,soft
20,40,12,8,1,9,9.5
40,60,7,5,1,4,5.5
60,80,3,0,0,1,0
"""


def read(text: str, folder: Path = Path()) -> Analysis:
    """Read a text as the file a.toml in a folder."""
    return analysis_from_text(text, folder, "a.toml")


def with_table(tmp_path: Path, more: str = "", region: str = "") -> Analysis:
    """Read the line search with its bins and a template process from a table."""
    (tmp_path / "t.csv").write_text(TABLE)
    bins = "edges = [20, 40, 60, 80]\nobserved = [12, 7, 3]\n"
    fakes = '[processes.fakes]\nkind = "background"\n[processes.fakes.regions.peak]\n'
    fakes += 'shape = { template = { column = "fakes" } }\n'
    return read(LINE.replace(bins, f'table = "t.csv"\n{region}') + fakes + more, tmp_path)


def codes(analysis: Analysis) -> list[str]:
    return [caution.code for caution in analysis.cautions]


def problems(text: str, folder: Path = Path()) -> list[tuple[str, str]]:
    """Return what and where of everything that is wrong with a text."""
    with pytest.raises(InputError) as refusal:
        read(text, folder)
    return [(problem.what, problem.where) for problem in refusal.value.problems]


def test_every_kind_of_declaration_is_read_as_written() -> None:
    analysis = read_analysis(EVERYTHING)
    assert analysis.title == "Everything at once"
    assert analysis.exposure == Exposure(24.0, "fb^-1", 0.02)
    assert analysis.parameter("mass").prior == Uniform(20.0, 80.0)
    assert analysis.parameter("mass").unit == "GeV"
    assert analysis.parameter("width").prior == Normal(1.2, 0.1, low=0.0)
    assert analysis.parameter("rate").prior == LogNormal(1.0, 1.1)
    assert analysis.parameter("f").prior == Fixed(2.5)
    peak, side = analysis.region("peak"), analysis.region("side band")
    assert (peak.template_errors, peak.negative_templates, peak.empty_bin_events) == (True, "zero", 1e-3)
    np.testing.assert_array_equal(side.table.binning.low, [80.0, 90.0, 100.0])
    np.testing.assert_array_equal(side.table.observed, [3.0, 0.0, 2.0])
    assert analysis.process("continuum").regions["peak"] == Contribution(Falling("continuum scale"), 1200.0)
    assert analysis.process("flat").factors == ("b", 2.0, "b2")
    assert not analysis.process("flat").follows_exposure
    assert analysis.process("flat").regions["side band"] == Contribution(
        Bernstein((1.0, "h", ("l", 2.0))), Curve("mass", (20.0, 50.0, 80.0), (1.0, 2.0, 4.0))
    )
    assert analysis.process("cb").regions["peak"].shape == CrystalBall(50.0, 2.0, 1.5, "f", 2.0, 3.0)
    assert analysis.process("resonance").regions["peak"].shape == Gaussian(
        "mass", Curve("mass", (20.0, 80.0), (1.0, 2.0))
    )
    assert analysis.process("moving").regions["peak"] == Contribution(
        Templates("mass", (20.0, 50.0, 80.0), ("t20", "t50", "t80")), None
    )


def test_every_kind_of_uncertainty_is_read_as_written() -> None:
    analysis = read_analysis(EVERYTHING)
    assert analysis.uncertainty("muon efficiency").effects == (
        Effect("continuum", 0.02),
        Effect("resonance", 0.03, -0.04),
    )
    assert analysis.uncertainty("fake composition").effects == (Effect("fakes", "fakes hard", "fakes soft"),)
    assert analysis.uncertainty("limited") == Uncertainty(
        "limited", (Effect("continuum", 0.05), Effect("flat", 0.1, None, ("peak",))), ("peak",)
    )
    assert analysis.uncertainty("sizes").effects == (
        Effect("continuum", 0.05, None, ("peak",)),
        Effect("continuum", 0.02, -0.03, ("side band",)),
    )


def test_a_parameter_that_a_hypothesis_does_not_use_or_holds_is_not_free_in_it() -> None:
    analysis = read_analysis(EVERYTHING)
    background, resonance = (analysis.parameters_used(name) for name in ("background only", "resonance"))
    assert "strength" not in background
    assert "f" not in background
    assert resonance == ("strength", "continuum scale", "width", "rate", "g", "e", "h", "l", "b", "b2")
    assert analysis.held_parameters("resonance") == {"f": 2.5, "mass": 45.0}


def test_a_parameter_that_a_background_shares_is_no_signal_parameter() -> None:
    assert read(LINE).signal_parameters("signal plus background") == ("strength", "mass")
    shared = LINE.replace("scale = 18", 'scale = "mass"')
    assert read(shared).signal_parameters("signal plus background") == ("strength",)


def test_left_out_hypotheses_are_the_backgrounds_and_everything() -> None:
    assert read(LINE).hypotheses == (
        Hypothesis("background only", ("continuum",), 0.5),
        Hypothesis("signal plus background", ("continuum", "line"), 0.5),
    )


def test_a_source_acts_only_where_one_of_its_processes_is() -> None:
    text = LINE + "[exposure]\ncollected = 1\nuncertainty = 0.02\n"
    text += "[uncertainties.a]\neffects.line = 0.1\n[uncertainties.b]\neffects.continuum = 0.1\n"
    assert read(text).sources_used("background only") == ("b", "exposure")
    assert read(text).sources_used("signal plus background") == ("a", "b", "exposure")
    still = text.replace('kind = "background"', 'kind = "background"\nfollows_exposure = false')
    assert read(still).sources_used("background only") == ("b",)


def test_planning_needs_no_observed_counts() -> None:
    assert read(LINE.replace("observed = [12, 7, 3]\n", "")).region("peak").table.observed is None


def test_a_file_and_the_same_things_in_python_are_equal(tmp_path: Path) -> None:
    analysis = with_table(tmp_path)
    again = Analysis(
        title="A line",
        regions=analysis.regions,
        parameters=analysis.parameters,
        processes=analysis.processes,
    )
    assert again == analysis
    assert hash(again) == hash(analysis)
    assert Analysis("Another", again.regions, again.parameters, again.processes) != analysis


def test_equality_sees_every_number_of_a_table(tmp_path: Path) -> None:
    first = with_table(tmp_path)
    (tmp_path / "u").mkdir()
    (tmp_path / "u" / "t.csv").write_text(TABLE.replace("40,60,7,5,1,4,5.5", "40,60,7,5,1,4,5.500001"))
    other = read(
        (LINE + "").replace("edges = [20, 40, 60, 80]\nobserved = [12, 7, 3]", 'table = "t.csv"'), tmp_path
    )
    changed = read(
        LINE.replace("edges = [20, 40, 60, 80]\nobserved = [12, 7, 3]", 'table = "t.csv"'), tmp_path / "u"
    )
    assert first != other
    assert other != changed


def test_a_bin_edge_problem_of_a_table_is_told_together_with_the_others(tmp_path: Path) -> None:
    (tmp_path / "t.csv").write_text(TABLE.replace("40,60,7", "40,60,-7"))
    text = LINE.replace("edges = [20, 40, 60, 80]\nobserved = [12, 7, 3]", 'table = "t.csv"')
    told = problems(text.replace('mean = "mass"', 'mean = "mas"'), tmp_path)
    assert told == [
        ("Observed counts below zero", 't.csv, line 3, column "observed"'),
        (
            "A parameter that is not declared",
            "a.toml, line 19, processes.line.regions.peak.shape.gaussian.mean",
        ),
    ]


def test_what_depends_on_an_unreadable_part_is_not_complained_about() -> None:
    told = problems(LINE.replace("low = 30, high = 70", "low = 30, high = inf"))
    assert told == [("An improper prior", "a.toml, line 9, parameters.mass.prior.uniform.high")]


@pytest.mark.parametrize(
    "prior",
    [
        "exponential = { mean = 1 }",
        "halfnormal = { sd = 1 }",
        "lognormal = { median = 1, factor = 2 }",
        "normal = { mean = 1, sd = 1, low = 0 }",
        "beta = { a = 2, b = 3 }",
        "fixed = { value = 0 }",
    ],
)
def test_a_strength_that_is_never_negative_is_taken(prior: str) -> None:
    read(LINE.replace("uniform = { low = 0, high = 5 }", prior))


@pytest.mark.parametrize(
    "prior",
    [
        "uniform = { low = -0.001, high = 5 }",
        "normal = { mean = 1, sd = 0.1 }",
        "normal = { mean = 1, sd = 0.1, low = -1 }",
        "beta = { a = 2, b = 3, low = -1 }",
        "fixed = { value = -1 }",
    ],
)
def test_a_strength_that_can_be_negative_is_refused(prior: str) -> None:
    told = problems(LINE.replace("uniform = { low = 0, high = 5 }", prior))
    assert told == [("An expected count can be negative", "a.toml, line 7, parameters.strength.prior")]


def test_a_coupling_that_enters_squared_may_be_negative() -> None:
    text = LINE.replace("uniform = { low = 0, high = 5 }", "normal = { mean = 0, sd = 1 }")
    assert problems(text) == [
        ("An expected count can be negative", "a.toml, line 7, parameters.strength.prior")
    ]
    read(text.replace('["strength"]', '["strength", "strength"]'))
    read(text.replace("yield = 4", 'yield = ["strength", 4]'))


def test_a_normal_scale_far_above_zero_needs_no_cut() -> None:
    text = LINE.replace("scale = 18", 'scale = "mass"')
    read(text.replace("uniform = { low = 30, high = 70 }", "normal = { mean = 18, sd = 0.5 }"))
    told = problems(text.replace("uniform = { low = 30, high = 70 }", "normal = { mean = 18, sd = 9 }"))
    assert told == [("The scale of the exponential can be below 0", "a.toml, line 9, parameters.mass.prior")]


@pytest.mark.parametrize(
    "name", ["/etc/passwd", "C:\\table.csv", "", "  ", "loop.csv", "out.csv", "pipe.csv", "a\\u0000b"]
)
def test_a_table_is_a_plain_file_beside_the_analysis(name: str, tmp_path: Path) -> None:
    folder = tmp_path / "analysis"
    folder.mkdir()
    (tmp_path / "elsewhere.csv").write_text(TABLE)
    (folder / "out.csv").symlink_to(tmp_path / "elsewhere.csv")
    (folder / "loop.csv").symlink_to(folder / "loop.csv")
    os.mkfifo(folder / "pipe.csv")
    quoted = name.replace("C:\\", "C:\\\\")
    text = LINE.replace("edges = [20, 40, 60, 80]\nobserved = [12, 7, 3]", f'table = "{quoted}"')
    assert [where.partition(", file")[0] for _, where in problems(text, folder)] == [
        "a.toml, line 4, regions.peak.table"
    ]


def test_a_table_of_the_neighbouring_folder_can_be_named(tmp_path: Path) -> None:
    folder = tmp_path / "analysis"
    folder.mkdir()
    (tmp_path / "t.csv").write_text(TABLE)
    text = LINE.replace("edges = [20, 40, 60, 80]\nobserved = [12, 7, 3]", 'table = "../t.csv"')
    assert read(text, folder).region("peak").table.source == "../t.csv"


def test_error_columns_are_cautioned_about_until_somebody_decides(tmp_path: Path) -> None:
    assert codes(with_table(tmp_path)) == ["template-errors-unused"]
    assert codes(with_table(tmp_path, region="template_errors = false\n")) == []
    assert codes(with_table(tmp_path, region="template_errors = true\n")) == []


def test_a_variation_to_one_side_and_additive_bins_are_cautioned_about(tmp_path: Path) -> None:
    more = '[uncertainties.composition]\neffects.fakes = { up = "hard", down = "soft" }\n'
    analysis = with_table(tmp_path, more, "template_errors = true\n")
    # hard and soft sum to 14 and 15, fakes to 13; the last bin is 0 in fakes and soft.
    assert codes(analysis) == ["one-sided-uncertainty", "additive-variation"]
    assert "by +1 and +2 events" in analysis.cautions[0].text
    assert "in 1 of 3 bins" in analysis.cautions[1].text


@pytest.mark.parametrize(
    ("sizes", "expected"),
    [
        ("{ up = 0.1, down = 0.05 }", ["one-sided-uncertainty"]),
        ("{ up = -0.1, down = -0.05 }", ["one-sided-uncertainty"]),
        ("{ up = 0.1, down = -0.05 }", []),
        ("{ up = 0.1, down = 0 }", []),
        ("0.1", []),
    ],
)
def test_numbers_on_the_same_side_are_cautioned_about(sizes: str, expected: list[str]) -> None:
    assert codes(read(LINE + f"[uncertainties.a]\neffects.line = {sizes}\n")) == expected


def test_a_first_hypothesis_with_signal_is_cautioned_about() -> None:
    only = '[hypotheses.b]\nprocesses = ["continuum"]\n'
    both = '[hypotheses.s]\nprocesses = ["continuum", "line"]\n'
    assert codes(read(LINE + only + both)) == []
    assert codes(read(LINE + both + only)) == ["first-hypothesis-has-signal"]


def test_a_number_held_where_the_prior_has_nothing_is_cautioned_about() -> None:
    text = (
        LINE
        + '[hypotheses.b]\nprocesses = ["continuum"]\n[hypotheses.s]\nprocesses = ["continuum", "line"]\n'
    )
    assert codes(read(text + "fix = { mass = 45 }\n")) == []
    assert codes(read(text + "fix = { mass = 75 }\n")) == ["held-outside-prior"]


@pytest.mark.parametrize(("distance", "expected"), [(20, []), (50, ["templates-spaced-wide"])])
def test_templates_further_apart_than_the_peak_is_wide_are_cautioned_about(
    tmp_path: Path, distance: int, expected: list[str]
) -> None:
    """The central 68 % of a normal peak of sd 15 is 30 wide."""
    edges = np.arange(-100.0, 221.0)
    centres = 0.5 * (edges[1:] + edges[:-1])
    peaks = [np.exp(-0.5 * ((centres - mass) / 15.0) ** 2) for mass in (30.0, 30.0 + distance)]
    rows = [f"{a},{b},0,{p},{q}" for a, b, p, q in zip(edges[:-1], edges[1:], *peaks, strict=True)]
    (tmp_path / "t.csv").write_text("\n".join(["low,high,observed,one,two", *rows]) + "\n")
    text = LINE.replace("edges = [20, 40, 60, 80]\nobserved = [12, 7, 3]", 'table = "t.csv"')
    templates = 'templates = { parameter = "mass", at = [30, 70], columns = ["one", "two"] }'
    assert (
        codes(read(text.replace('gaussian = { mean = "mass", sd = 1.2 }', templates), tmp_path)) == expected
    )


def test_template_bins_below_zero_are_set_to_zero_only_where_asked(tmp_path: Path) -> None:
    (tmp_path / "t.csv").write_text(TABLE.replace("60,80,3,0,", "60,80,3,-1,"))
    text = LINE.replace(
        "edges = [20, 40, 60, 80]\nobserved = [12, 7, 3]", 'table = "t.csv"\ntemplate_errors = true'
    )
    assert problems(text, tmp_path) == [("Template bins below zero", 't.csv, line 4, column "fakes"')]
    analysis = read(text.replace("template_errors", 'negative_templates = "zero"\ntemplate_errors'), tmp_path)
    assert analysis.region("peak").table.columns["fakes"].tolist() == [8.0, 5.0, 0.0]
    assert codes(analysis) == ["negative-template-zeroed"]


def test_template_bins_below_zero_are_told_of_beside_other_faults_unless_they_are_set_to_zero(
    tmp_path: Path,
) -> None:
    """The table's own faults hid what the region refuses, which came up only once they were mended."""
    (tmp_path / "t.csv").write_text(TABLE.replace("60,80,3,0,", "60,80,3.5,-1,"))
    text = LINE.replace(
        "edges = [20, 40, 60, 80]\nobserved = [12, 7, 3]", 'table = "t.csv"\ntemplate_errors = true'
    )
    whats = ["Observed counts that are not whole numbers", "Template bins below zero"]
    assert [what for what, _ in problems(text, tmp_path)] == whats
    zeroed = text.replace("template_errors", 'negative_templates = "zero"\ntemplate_errors')
    assert [what for what, _ in problems(zeroed, tmp_path)] == whats[:1]


def test_lines_are_found_in_every_layout_that_toml_allows() -> None:
    text = """# [not.a.header]
title = "a = 1 # no comment"
a.b."c d" = [ # one
  1, # two ]
  2,
]
[x.'y]z']   # three
k = '''
[not] = a key
'''
s = \"\"\"q\\\"\"\"\"
[[list]]
m = { n = 1, o = { p = 2 } }
"""
    assert key_lines(text) == {
        ("title",): 2,
        ("a",): 3,
        ("a", "b"): 3,
        ("a", "b", "c d"): 3,
        ("x",): 7,
        ("x", "y]z"): 7,
        ("x", "y]z", "k"): 8,
        ("x", "y]z", "s"): 11,
        ("list",): 12,
        ("list", "m"): 13,
    }


def test_an_unknown_name_is_an_input_error_in_python_too() -> None:
    with pytest.raises(InputError, match='write "strength"'):
        read(LINE).parameter("stength")
    with pytest.raises(InputError, match="hypothesis"):
        read(LINE).parameters_used("nothing")
