"""The commands on the data that ship with the project, from the file to what a user reads."""

from __future__ import annotations

import json
import math
from pathlib import Path
from typing import Any

import pytest

from workbench.commands.main import main
from workbench.records.files import read_record

DATA = Path(__file__).parents[2] / "data"
SORREL = DATA / "sorrel" / "sorrel.toml"
FIXED_MASS = DATA / "skerry" / "skerry-fixed-mass.toml"
BARE = DATA / "skerry" / "counts.csv"


def weighed(path: Path, capsys: pytest.CaptureFixture[str], *options: str) -> dict[str, Any]:
    """Return the record that `weigh --json` prints."""
    code = main(["weigh", str(path), "--json", *options])
    said = capsys.readouterr()
    assert code == 0, said.err
    record: dict[str, Any] = json.loads(said.out)
    return record


@pytest.mark.parametrize("path", [SORREL, FIXED_MASS, BARE])
def test_posterior_odds_are_the_bayes_factor_times_the_prior_odds(
    path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    record = weighed(path, capsys)
    (comparison,) = record["comparisons"]
    against, favoured = record["hypotheses"]
    ln_factor = favoured["ln_evidence"] - against["ln_evidence"]
    assert comparison["ln_bayes_factor"] == pytest.approx(ln_factor, abs=1e-9)
    odds = math.exp(ln_factor) * favoured["prior"] / against["prior"]
    assert comparison["posterior_odds"] == pytest.approx(odds)
    assert favoured["posterior"] / against["posterior"] == pytest.approx(odds)
    assert sum(item["posterior"] for item in record["hypotheses"]) == pytest.approx(1.0)


def test_the_same_seed_gives_the_same_record_and_another_seed_another(
    capsys: pytest.CaptureFixture[str],
) -> None:
    first, again, other = (weighed(FIXED_MASS, capsys, "--seed", seed) for seed in ("7", "7", "8"))
    assert first == again
    assert first["inputs"] == other["inputs"]
    ln_factors = [record["comparisons"][0]["ln_bayes_factor"] for record in (first, other)]
    errors = [record["comparisons"][0]["ln_bayes_factor_error"] for record in (first, other)]
    assert ln_factors[0] != ln_factors[1]
    assert abs(ln_factors[0] - ln_factors[1]) < 5.0 * math.hypot(*errors)


def test_inputs_are_named_by_the_digests_of_their_bytes(capsys: pytest.CaptureFixture[str]) -> None:
    import hashlib

    found = weighed(SORREL, capsys)["inputs"]
    assert found["analysis"] == f"sha256:{hashlib.sha256(SORREL.read_bytes()).hexdigest()}"
    assert set(found["tables"]) == {"sorrel-signal.csv", "sorrel-control.csv"}
    for name, digest in found["tables"].items():
        content = (SORREL.parent / name).read_bytes()
        assert digest == f"sha256:{hashlib.sha256(content).hexdigest()}"


def test_an_analysis_saved_from_a_bare_histogram_gives_the_same_odds(
    capsys: pytest.CaptureFixture[str], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    Path("counts.csv").write_bytes(BARE.read_bytes())
    bare = weighed(Path("counts.csv"), capsys, "--save", "made.toml")
    made = weighed(Path("made.toml"), capsys)
    assert made["comparisons"] == bare["comparisons"]
    assert made["inputs"]["content"] == bare["inputs"]["content"]


@pytest.mark.parametrize("command", ["check", "fit", "weigh"])
def test_each_command_answers_in_text_and_keeps_its_record(
    command: str, capsys: pytest.CaptureFixture[str], tmp_path: Path
) -> None:
    kept = tmp_path / "record.json"
    assert main([command, str(SORREL), "--output", str(kept)]) == 0
    screen = capsys.readouterr().out
    assert screen.startswith("Counting experiment with a control region at Sorrel\n")
    assert read_record(kept)["command"] == command
    assert ("posterior odds" in screen) == (command == "weigh")


def test_a_wider_background_uncertainty_weakens_the_evidence(capsys: pytest.CaptureFixture[str]) -> None:
    narrow, wide = (
        weighed(BARE, capsys, "--background-uncertainty", size)["comparisons"][0]["ln_bayes_factor"]
        for size in ("0.05", "0.2")
    )
    assert narrow > wide
