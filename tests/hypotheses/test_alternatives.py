"""Backgrounds in doubt: read as written, the same in Python, and taken apart into plain analyses.

The expectations are worked out by hand from the contract of the file format.
"""

from __future__ import annotations

import difflib
from dataclasses import replace
from pathlib import Path

import pytest

import workbench as wb
from workbench.hypotheses.alternatives import in_doubt, variants_of, with_choice
from workbench.hypotheses.checks.alternatives import MOST_CHOICES
from workbench.likelihood.model import compile_model

FILE = Path(__file__).parent / "files" / "alternatives.toml"
PEAK = wb.Contribution(wb.Flat(), 3.0)


@pytest.fixture(scope="module")
def declared() -> wb.Analysis:
    return wb.read_analysis(FILE)


def one_region(*processes: wb.Process, **more: object) -> wb.Analysis:
    table = wb.Table(wb.Binning.from_edges([0.0, 1.0, 2.0]), [3, 4])
    made = {"regions": (wb.Region("peak", table),), "processes": processes, **more}
    return wb.Analysis("One region", **made)


def told(*processes: wb.Process, **more: object) -> list[str]:
    with pytest.raises(wb.InputError) as refusal:
        one_region(*processes, **more)
    return [problem.what for problem in refusal.value.problems]


def doubted(name: str, number: int) -> wb.Process:
    made = [wb.Alternative(f"shape {place}", {"peak": PEAK}) for place in range(number)]
    return wb.Process(name, "background", {}, alternatives=tuple(made))


def test_an_alternative_is_read_as_written(declared: wb.Analysis) -> None:
    continuum = declared.process("continuum")
    assert continuum.regions == {}
    assert continuum.alternatives == (
        wb.Alternative(
            "falling",
            {"peak": wb.Contribution(wb.Falling("scale"), 20.0), "side": wb.Contribution(wb.Flat(), 3.0)},
            2.0,
        ),
        wb.Alternative(
            "power law",
            {
                "peak": wb.Contribution(wb.PowerLaw("index"), 21.0),
                "side": wb.Contribution(wb.Bernstein((1.0, "bend")), (2.0, "bend")),
            },
        ),
    )
    fakes = declared.process("fakes")
    assert set(fakes.regions) == {"side"}
    assert [(one.name, one.prior) for one in fakes.alternatives] == [("hard", 1.0), ("soft", 0.5)]


def test_a_process_in_doubt_uses_the_parameters_of_every_alternative(declared: wb.Analysis) -> None:
    assert declared.process("continuum").parameters == ("scale", "index", "bend")
    assert declared.process("continuum").region_names == ("peak", "side")
    assert declared.parameters_used("background only") == ("scale", "index", "bend")
    assert declared.signal_parameters("line") == ("strength",)


def test_variants_are_every_combination_with_the_product_of_the_priors(declared: wb.Analysis) -> None:
    """Priors 2 : 1 of the continuum and 1 : 0.5 of the fakes are 4/9, 2/9, 2/9 and 1/9."""
    variants = variants_of(declared)
    assert [one.name for one in variants] == [
        "continuum: falling, fakes: hard",
        "continuum: falling, fakes: soft",
        "continuum: power law, fakes: hard",
        "continuum: power law, fakes: soft",
    ]
    assert [one.prior for one in variants] == pytest.approx([4 / 9, 2 / 9, 2 / 9, 1 / 9])
    assert all(in_doubt(one.analysis) == () for one in variants)


def test_a_hypothesis_without_a_process_in_doubt_has_no_choice_of_it(declared: wb.Analysis) -> None:
    variants = variants_of(declared, "without fakes")
    assert [one.name for one in variants] == ["falling", "power law"]
    assert [one.prior for one in variants] == pytest.approx([2 / 3, 1 / 3])


def test_a_parameter_of_another_alternative_is_no_part_of_a_variant(declared: wb.Analysis) -> None:
    falling, power = variants_of(declared, "without fakes")
    assert falling.analysis.parameters_used("background only") == ("scale",)
    assert power.analysis.parameters_used("background only") == ("index", "bend")


def test_a_held_parameter_is_held_only_where_it_is_used(declared: wb.Analysis) -> None:
    falling, power = variants_of(declared, "without fakes")
    assert falling.analysis.hypothesis("line").fix == {}
    assert power.analysis.hypothesis("line").fix == {"bend": 1.0}


def test_a_chosen_alternative_is_the_analysis_that_one_would_have_written(declared: wb.Analysis) -> None:
    text = FILE.read_text(encoding="utf-8")
    before, rest = text.split("[processes.continuum.alternatives.falling]")
    _, after = rest.split("[processes.fakes]\n")
    plain = 'regions.peak = { yield = 20, shape = { exponential = { scale = "scale" } } }\n'
    plain += "regions.side = { yield = 3, shape = { uniform = {} } }\n[processes.fakes]\n"
    written = (before + plain + after).replace("fix = { bend = 1 }\n", "")
    start, stop = written.index("[processes.fakes.alternatives]"), written.index("[processes.line]")
    hard = '[processes.fakes.regions.peak]\nshape = { template = { column = "hard" } }\n'
    written = written[:start] + hard + written[stop:]
    path = FILE.with_name("written-by-hand.toml")
    from workbench.hypotheses.file.reading import analysis_from_text

    by_hand = analysis_from_text(written, path.parent, str(path))
    assert with_choice(declared, {"continuum": "falling", "fakes": "hard"}) == by_hand


def test_without_alternatives_the_only_variant_is_the_analysis_itself() -> None:
    analysis = one_region(wb.Process("flat", "background", {"peak": PEAK}))
    (only,) = variants_of(analysis)
    assert only.analysis is analysis
    assert (only.name, only.prior) == ("", 1.0)


def test_python_says_what_the_file_says(declared: wb.Analysis) -> None:
    continuum = wb.Process(
        "continuum",
        "background",
        {},
        (1.1,),
        alternatives=(
            wb.Alternative(
                "falling",
                {"peak": wb.Contribution(wb.Falling("scale"), 20.0), "side": wb.Contribution(wb.Flat(), 3.0)},
                prior=2.0,
            ),
            declared.process("continuum").alternatives[1],
        ),
    )
    assert replace(declared, processes=(continuum, *declared.processes[1:])) == declared


def test_another_prior_or_another_shape_is_another_analysis(declared: wb.Analysis) -> None:
    process = declared.process("continuum")
    first, second = process.alternatives
    for changed in ((replace(first, prior=3.0), second), (second, first)):
        other = replace(process, alternatives=changed)
        assert replace(declared, processes=(other, *declared.processes[1:])) != declared


def test_a_changed_prior_changes_one_line_of_the_file(declared: wb.Analysis, tmp_path: Path) -> None:
    for name in ("alternatives.toml", "alternatives.csv"):
        (tmp_path / name).write_bytes(FILE.with_name(name).read_bytes())
    path = tmp_path / "alternatives.toml"
    process = declared.process("continuum")
    changed = (replace(process.alternatives[0], prior=3.0), process.alternatives[1])
    analysis = replace(declared, processes=(replace(process, alternatives=changed), *declared.processes[1:]))
    before = path.read_text(encoding="utf-8").splitlines()
    wb.write_analysis(analysis, path, keep=path)
    assert wb.read_analysis(path) == analysis
    after = path.read_text(encoding="utf-8").splitlines()
    assert [line for line in difflib.ndiff(before, after) if line[0] in "+-"] == [
        "- prior = 2",
        "+ prior = 3",
    ]


def test_an_added_alternative_leaves_the_other_lines(declared: wb.Analysis, tmp_path: Path) -> None:
    for name in ("alternatives.toml", "alternatives.csv"):
        (tmp_path / name).write_bytes(FILE.with_name(name).read_bytes())
    path = tmp_path / "alternatives.toml"
    process = declared.process("continuum")
    third = wb.Alternative("flat", {"peak": wb.Contribution(wb.Flat(), 9.0), "side": PEAK}, 0.1)
    changed = replace(process, alternatives=(*process.alternatives, third))
    analysis = replace(declared, processes=(changed, *declared.processes[1:]))
    before = path.read_text(encoding="utf-8").splitlines()
    wb.write_analysis(analysis, path, keep=path)
    assert wb.read_analysis(path) == analysis
    after = path.read_text(encoding="utf-8").splitlines()
    assert [line for line in difflib.ndiff(before, after) if line[0] == "-"] == []


def test_what_only_python_can_say_wrong_is_told() -> None:
    twice = wb.Process(
        "flat",
        "background",
        {},
        alternatives=(wb.Alternative("a", {"peak": PEAK}), wb.Alternative("a", {"peak": PEAK}, 2.0)),
    )
    assert "Two alternatives of the same name" in told(twice)
    unprintable = wb.Process(
        "flat",
        "background",
        {},
        alternatives=(
            wb.Alternative("\x1b", {"peak": PEAK}),
            wb.Alternative("b", {"peak": PEAK}, float("nan")),
        ),
    )
    assert told(unprintable) == ["A name that cannot be printed", "A prior probability that is not above 0"]


def test_a_combination_of_too_many_alternatives_is_refused_and_one_less_is_not() -> None:
    assert MOST_CHOICES == 64
    assert len(variants_of(one_region(doubted("a", 8), doubted("b", 8)))) == 64
    assert told(doubted("a", 8), doubted("b", 9)) == ["More combinations of alternatives than can be weighed"]


def test_one_model_is_not_made_of_several_alternatives(declared: wb.Analysis) -> None:
    with pytest.raises(wb.InputError, match="alternatives") as refusal:
        compile_model(declared, "line")
    assert len(refusal.value.problems) == 2
    assert compile_model(variants_of(declared)[0].analysis, "line").size == 4
