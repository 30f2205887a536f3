"""`oddsbench priors` with an engine that answers at once: options, exit codes, files."""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest

from tests.records import hand_built as hand
from tests.records import hand_built_priors as hand_priors
from workbench.commands import priors
from workbench.commands.main import main


@pytest.fixture(autouse=True)
def asked(monkeypatch: pytest.MonkeyPatch) -> dict[str, Any]:
    """Let every calculation answer with what was built by hand; return what it was asked."""
    adequacies = {item.hypothesis: item for item in hand.adequacies()}
    seen: dict[str, Any] = {}

    def examined(analysis: object, **options: Any) -> object:
        seen.update(options)
        return hand_priors.examination()

    monkeypatch.setattr(
        priors, "load", lambda options, seed: (hand.analysis(), replace(hand.ORIGIN, seed=seed))
    )
    monkeypatch.setattr(priors, "adequacy", lambda analysis, name, seed, most: adequacies[name])
    monkeypatch.setattr(priors, "prior_sensitivity", examined)
    return seen


def test_the_screen_is_printed_and_warnings_follow(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["priors", "tern.toml"]) == 0
    said = capsys.readouterr()
    assert "ln B by the prior's family and mean" in said.out
    assert said.err.startswith("warning: Every number here is averaged")


def test_options_reach_the_engine_and_the_record(
    asked: dict[str, Any], capsys: pytest.CaptureFixture[str]
) -> None:
    words = ["--posterior", "0.9", "--hypothesis", "resonance", "--parameter", "strength", "--seed", "7"]
    assert main(["priors", "tern.toml", "--json", *words]) == 0
    record = json.loads(capsys.readouterr().out)
    assert (asked["posterior"], asked["hypothesis"], asked["parameter"], asked["seed"]) == (
        0.9,
        "resonance",
        "strength",
        7,
    )
    assert record["options"]["posterior"] == 0.9
    assert record["seed"] == 7


@pytest.mark.parametrize("given", ["0", "1", "1.2", "-0.1", "nan", "most"])
def test_a_posterior_that_is_no_probability_is_refused(
    given: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(["priors", "tern.toml", f"--posterior={given}"]) == 2
    said = capsys.readouterr().err
    assert "--posterior is not a probability between 0 and 1" in said
    assert f'found     "{given}"' in said


def test_what_is_not_established_ends_with_1(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setattr(priors, "prior_sensitivity", lambda analysis, **options: hand_priors.unestablished())
    assert main(["priors", "tern.toml"]) == 1
    assert "NOT ESTABLISHED: NOTHING IS SAID ABOUT PRIORS" in capsys.readouterr().out


@pytest.mark.parametrize(("kind", "start"), [("png", b"\x89PNG"), ("svg", b"<?xml"), ("pdf", b"%PDF")])
def test_a_picture_is_drawn_where_asked_for(kind: str, start: bytes, tmp_path: Path) -> None:
    assert main(["priors", "tern.toml", "--picture", str(tmp_path / f"priors.{kind}")]) == 0
    assert (tmp_path / f"priors.{kind}").read_bytes().startswith(start)


def test_a_plan_without_counts_is_refused(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    analysis = hand.analysis()
    region = analysis.regions[0]
    plan = replace(analysis, regions=(replace(region, table=replace(region.table, observed=None)),))
    monkeypatch.setattr(priors, "load", lambda options, seed: (plan, hand.ORIGIN))
    assert main(["priors", "tern.toml"]) == 2
    assert "priors needs observed counts" in capsys.readouterr().err


def test_an_unknown_hypothesis_is_refused_with_the_known_ones(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.undo()
    root = Path(__file__).parents[2]
    assert main(["priors", str(root / "data/sorrel/sorrel.toml"), "--hypothesis", "decay"]) == 2
    assert 'one of: "signal plus background"' in capsys.readouterr().err
