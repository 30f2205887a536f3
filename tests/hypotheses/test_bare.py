"""A histogram file alone stands for an analysis; expectations by hand from the contract."""

from __future__ import annotations

from pathlib import Path

import pytest

import workbench as wb
from workbench.hypotheses.bare import analysis_from_table, parse_prior


def table(*names: str, errors: tuple[str, ...] = ()) -> wb.Table:
    """Return a table of two bins with the named columns."""
    columns = {name: [1.0 + place, 2.0] for place, name in enumerate(names)}
    return wb.Table(wb.Binning.from_edges([0, 1, 2]), [3, 4], columns, {name: [0.1, 0.2] for name in errors})


def test_signal_columns_share_one_strength_and_backgrounds_have_an_uncertainty_each() -> None:
    analysis = analysis_from_table(table("flat", "signal", "fakes", "signal tail", "signals"))
    kinds = {process.name: (process.kind, process.factors) for process in analysis.processes}
    assert kinds == {
        "flat": ("background", ()),
        "fakes": ("background", ()),
        "signals": ("background", ()),
        "signal": ("signal", ("strength",)),
        "signal tail": ("signal", ("strength",)),
    }
    assert analysis.parameters == (wb.Parameter("strength", wb.Uniform(0.0, 5.0)),)
    assert [source.effects for source in analysis.uncertainties] == [
        (wb.Effect(name, 0.10),) for name in ("flat", "fakes", "signals")
    ]
    assert [(one.name, one.prior) for one in analysis.hypotheses] == [
        ("background only", 0.5),
        ("signal plus background", 0.5),
    ]


@pytest.mark.parametrize(("errors", "expected"), [((), False), (("flat",), True)])
def test_error_columns_enter_the_likelihood(errors: tuple[str, ...], expected: bool) -> None:
    analysis = analysis_from_table(table("flat", "signal", errors=errors))
    assert analysis.regions[0].template_errors is expected
    assert analysis.cautions == ()


def test_the_strength_and_the_size_can_be_chosen() -> None:
    chosen = analysis_from_table(
        table("flat", "signal"),
        strength=parse_prior("{ exponential = { mean = 2 } }"),
        background_uncertainty=0.25,
    )
    assert chosen.parameter("strength").prior == wb.Exponential(2.0)
    assert chosen.uncertainties[0].effects == (wb.Effect("flat", 0.25),)
    assert analysis_from_table(table("flat", "signal"), background_uncertainty=0.0).uncertainties == ()


def test_the_saved_analysis_is_the_same(tmp_path: Path) -> None:
    path = tmp_path / "counts.csv"
    path.write_text(
        "low,high,observed,flat,flat error,signal,signal tail\n0,1,3,1.5,0.1,1,0\n1,2,4,2.5,0.2,0,0.5\n"
    )
    analysis = analysis_from_table(wb.read_csv_table(path, "counts.csv"))
    wb.write_analysis(analysis, tmp_path / "saved.toml")
    assert 'table = "counts.csv"' in (tmp_path / "saved.toml").read_text()
    assert wb.read_analysis(tmp_path / "saved.toml") == analysis


@pytest.mark.parametrize(
    ("columns", "strength", "size", "what"),
    [
        (("flat",), wb.Uniform(0, 5), 0.1, "A histogram without a signal column"),
        ((), wb.Uniform(0, 5), 0.1, "A histogram without a signal column"),
        (("signal",), wb.Uniform(0, 5), 0.1, "A histogram without a background column"),
        (("flat", "signal"), wb.Normal(1, 1), 0.1, "A strength that can be negative"),
        (("flat", "signal"), wb.Uniform(0, 5), -0.1, "An uncertainty of the backgrounds below 0"),
        (("flat", "signal"), wb.Uniform(0, 5), float("nan"), "An uncertainty of the backgrounds below 0"),
    ],
)
def test_what_makes_no_search_is_refused(
    columns: tuple[str, ...], strength: wb.Uniform | wb.Normal, size: float, what: str
) -> None:
    with pytest.raises(wb.InputError) as refusal:
        analysis_from_table(table(*columns), strength=strength, background_uncertainty=size)
    assert [problem.what for problem in refusal.value.problems] == [what]


@pytest.mark.parametrize(
    ("text", "where", "what"),
    [
        ("uniform", "--strength", "A prior that cannot be read"),
        ("[" * 5000, "--strength", "A prior that cannot be read"),
        (
            "{ uniform = { low = 0, high = 5 } }\nx = 1",
            "--strength",
            "More than one value where a prior belongs",
        ),
        ("3", "--strength", "prior is not a table"),
        ("{ unifrom = { low = 0, high = 5 } }", "--strength", "A prior family that is not known"),
        ("{ uniform = { low = 0, high = inf } }", "--strength, uniform, high", "An improper prior"),
        ("{ uniform = { low = 0 } }", "--strength, uniform", "The key high is left out"),
        ("{ halfnormal = { sd = -1 } }", "--strength, halfnormal", "The prior's sd is not above 0"),
    ],
)
def test_a_prior_on_the_command_line_is_read_or_refused(text: str, where: str, what: str) -> None:
    with pytest.raises(wb.InputError) as refusal:
        parse_prior(text)
    assert [(problem.where, problem.what) for problem in refusal.value.problems] == [(where, what)]


def test_a_prior_without_its_outer_braces_is_shown_with_them() -> None:
    """Only "unreadable value" was said where the outer braces had been forgotten."""
    with pytest.raises(wb.InputError) as refusal:
        parse_prior("uniform = { low = 0, high = 5 }")
    assert str(refusal.value) == (
        "A prior without its outer braces\n"
        "  where     --strength\n"
        '  found     "uniform = { low = 0, high = 5 }": no { before it and no } after it\n'
        "  expected  { FAMILY = { ... } }, braces included\n"
        '  try       write "{ uniform = { low = 0, high = 5 } }", the quotes for the shell'
    )


def test_a_prior_without_its_family_is_told_to_name_it() -> None:
    with pytest.raises(wb.InputError) as refusal:
        parse_prior("{ low = 0, high = 5 }")
    (problem,) = refusal.value.problems
    assert problem.what == "A prior has exactly one family"
    assert problem.remedy == "name the family around the numbers, such as { uniform = { low = 0, high = 5 } }"


@pytest.mark.parametrize(
    ("text", "missing"),
    [
        ("uniform(0, 5)", "no { at its start"),
        ("{ uniform = { low = 0, high = 5 }", "unclosed inline table"),
        ("{ uniform { low = 0 } }", 'expected "=" after a key in a key/value pair'),
    ],
)
def test_a_prior_that_cannot_be_read_says_what_is_missing_and_shows_one_that_can(
    text: str, missing: str
) -> None:
    with pytest.raises(wb.InputError) as refusal:
        parse_prior(text)
    (problem,) = refusal.value.problems
    assert problem.found == f'"{text}": {missing}'
    shown = problem.remedy.split('"')[1]
    assert parse_prior(shown) == wb.Uniform(0.0, 5.0)
