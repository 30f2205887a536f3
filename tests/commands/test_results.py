"""The three commands with an engine that answers at once: what is printed, what is written, how it ends."""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from tests.records import hand_built as hand
from workbench.commands import check, fit, inputs, judging, weigh
from workbench.commands.main import main
from workbench.evidence.results import Weighing
from workbench.hypotheses.analysis import Analysis
from workbench.likelihood.results import Ending

TABLE = "low,high,observed,flat,signal\n0,1,4,3.0,1.0\n1,2,3,3.0,0.5\n"


WARNING = (
    'warning: tern.csv has error columns ("fakes error") that are not used: '
    "write template_errors = true or false in regions.peak.\n"
)


def with_unused_errors(analysis: Analysis) -> Analysis:
    """Return an analysis whose table has errors, of which nobody said what to do with them."""
    region = analysis.regions[0]
    table = replace(region.table, errors={"fakes": np.full(region.table.binning.number, 0.1)})
    return replace(analysis, regions=(replace(region, table=table),))


@pytest.fixture(autouse=True)
def engine(monkeypatch: pytest.MonkeyPatch) -> None:
    """Let every calculation answer with what was built by hand."""
    adequacies = {item.hypothesis: item for item in hand.adequacies()}
    fits = {item.hypothesis: item for item in hand.fits()}
    predictives = {item.hypothesis: item for item in hand.checked().predictives}
    analysis = with_unused_errors(hand.analysis())
    for module in (weigh, check, fit):
        monkeypatch.setattr(module, "load", lambda options, seed: (analysis, replace(hand.ORIGIN, seed=seed)))
    for module in (judging, check):
        monkeypatch.setattr(module, "adequacy", lambda analysis, name, **options: adequacies[name])
    for module in (judging, fit):
        monkeypatch.setattr(module, "fit", lambda analysis, name, asymmetric: fits[name])
    monkeypatch.setattr(check, "prior_predictive", lambda analysis, name, seed: predictives[name])
    monkeypatch.setattr(weigh, "weigh", lambda analysis, seed, engine: replace(hand.weighing(), seed=seed))


def test_a_weighing_is_printed_as_its_screen(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["weigh", "tern.toml"]) == 0
    said = capsys.readouterr()
    assert "posterior odds  224.2 ± 1.1 : 1" in said.out
    assert WARNING in said.err


def test_what_is_not_established_ends_with_1(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setattr(weigh, "weigh", lambda analysis, seed, engine: hand.unestablished())
    assert main(["weigh", "tern.toml"]) == 1
    assert "NOT ESTABLISHED" in capsys.readouterr().out


def test_a_hypothesis_that_fails_is_an_answer_and_no_error(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    failing = {item.hypothesis: item for item in hand.adequacies(0.0005, 0.0005)}
    monkeypatch.setattr(judging, "adequacy", lambda analysis, name, **options: failing[name])
    assert main(["weigh", "tern.toml"]) == 0
    assert "NEITHER HYPOTHESIS DESCRIBES THE DATA" in capsys.readouterr().out.splitlines()[1]


@pytest.mark.parametrize("command", ["weigh", "check", "fit"])
def test_json_is_the_record_and_nothing_else(command: str, capsys: pytest.CaptureFixture[str]) -> None:
    assert main([command, "tern.toml", "--json"]) == 0
    said = capsys.readouterr()
    assert json.loads(said.out)["command"] == command
    assert said.err.startswith(WARNING)


def test_the_seed_and_options_are_on_record(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["weigh", "tern.toml", "--json", "--seed", "42", "--pseudo-experiments", "5000"]) == 0
    record = json.loads(capsys.readouterr().out)
    assert (record["seed"], record["options"]["pseudo_experiments"]) == (42, 5000)


def test_the_engine_asked_for_is_used_and_on_record(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    asked: list[str] = []

    def weighed(analysis: Analysis, seed: int, engine: str) -> Weighing:
        asked.append(engine)
        return replace(hand.weighing(), seed=seed)

    monkeypatch.setattr(weigh, "weigh", weighed)
    assert main(["weigh", "tern.toml", "--json", "--engine", "annealed"]) == 0
    assert json.loads(capsys.readouterr().out)["options"]["engine"] == "annealed"
    assert main(["weigh", "tern.toml"]) == 0
    assert asked == ["annealed", "auto"]
    capsys.readouterr()
    assert main(["weigh", "tern.toml", "--engine", "anneal"]) == 2
    assert 'write "annealed"' in capsys.readouterr().err


@pytest.mark.parametrize("command", ["weigh", "check", "fit"])
def test_an_output_file_is_json_or_text_by_its_ending(
    command: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main([command, "tern.toml", "--output", str(tmp_path / "r.json")]) == 0
    assert main([command, "tern.toml", "--output", str(tmp_path / "r.txt")]) == 0
    screen = capsys.readouterr().out
    assert json.loads((tmp_path / "r.json").read_text(encoding="utf-8"))["command"] == command
    assert screen == 2 * (tmp_path / "r.txt").read_text(encoding="utf-8")
    assert sorted(entry.name for entry in tmp_path.iterdir()) == ["r.json", "r.txt"]


@pytest.mark.parametrize("ending", [Ending.NOT_CONVERGED, Ending.NO_SUPPORT])
def test_a_fit_that_gives_nothing_to_use_ends_with_1(ending: Ending, monkeypatch: pytest.MonkeyPatch) -> None:
    fits = {item.hypothesis: replace(item, ending=ending) for item in hand.fits()}
    monkeypatch.setattr(fit, "fit", lambda analysis, name, asymmetric: fits[name])
    assert main(["fit", "tern.toml"]) == 1


@pytest.mark.parametrize(("kind", "start"), [("png", b"\x89PNG"), ("svg", b"<?xml"), ("pdf", b"%PDF")])
def test_a_picture_is_drawn_where_asked_for(kind: str, start: bytes, tmp_path: Path) -> None:
    assert main(["weigh", "tern.toml", "--picture", str(tmp_path / f"odds.{kind}")]) == 0
    assert (tmp_path / f"odds.{kind}").read_bytes().startswith(start)


def test_commands_that_need_counts_refuse_a_plan(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    plan = planned()
    for module in (weigh, fit, check):
        monkeypatch.setattr(module, "load", lambda options, seed: (plan, replace(hand.ORIGIN, seed=seed)))
    assert main(["weigh", "tern.toml"]) == 2
    assert main(["fit", "tern.toml"]) == 2
    assert capsys.readouterr().err.count('where     region "peak", tern.csv') == 2
    assert main(["check", "tern.toml"]) == 0
    assert "Nothing was observed yet" in capsys.readouterr().out


def planned() -> Analysis:
    """Return the analysis before anything was observed."""
    analysis = hand.analysis()
    region = analysis.regions[0]
    return replace(analysis, regions=(replace(region, table=replace(region.table, observed=None)),))


@pytest.fixture
def histogram(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> str:
    """Return the name of a bare histogram in the working folder, read as it would be."""
    monkeypatch.chdir(tmp_path)
    Path("counts.csv").write_text(TABLE, encoding="utf-8")
    for module in (weigh, check, fit):
        monkeypatch.setattr(module, "load", inputs.load)
    answer = hand.fits()[0]
    monkeypatch.setattr(fit, "fit", lambda analysis, name, asymmetric: replace(answer, hypothesis=name))
    return "counts.csv"


def test_a_bare_histogram_says_what_was_assumed(histogram: str, capsys: pytest.CaptureFixture[str]) -> None:
    options = ["--strength", "{ exponential = { mean = 2 } }", "--background-uncertainty", "0.2"]
    assert main(["fit", histogram, *options]) == 0
    screen = " ".join(capsys.readouterr().out.split())
    assert "its strength's prior is exponential with mean 2" in screen
    assert "every background has its own uncertainty of 20 %" in screen
    assert "Add --save FILE.toml to keep the analysis file that this made." in screen


def test_the_analysis_made_is_saved_and_read_back(histogram: str, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["fit", histogram, "--save", "made.toml"]) == 0
    assert "The analysis file that this made is made.toml." in " ".join(capsys.readouterr().out.split())
    assert main(["fit", "made.toml"]) == 0


def test_a_file_that_exists_is_not_replaced_by_save(
    histogram: str, capsys: pytest.CaptureFixture[str]
) -> None:
    Path("made.toml").write_text("mine", encoding="utf-8")
    assert main(["fit", histogram, "--save", "made.toml"]) == 2
    assert "File exists already" in capsys.readouterr().err
    assert Path("made.toml").read_text(encoding="utf-8") == "mine"


def test_histogram_options_do_not_go_with_an_analysis(
    histogram: str, capsys: pytest.CaptureFixture[str]
) -> None:
    words = ["fit", "made.toml", "--strength", "x", "--background-uncertainty", "0.1", "--save", "y.toml"]
    assert main(words) == 2
    assert capsys.readouterr().err.count("does not go with an analysis file") == 3


def test_a_file_of_another_kind_is_refused(histogram: str, capsys: pytest.CaptureFixture[str]) -> None:
    Path("counts.xls").write_text(TABLE, encoding="utf-8")
    assert main(["fit", "counts.xls"]) == 2
    assert 'the ending ".xls"' in capsys.readouterr().err
