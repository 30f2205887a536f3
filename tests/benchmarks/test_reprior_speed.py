"""Another prior on a saved updating ratio, and the scan that it is saved from: Skerry, its mass unknown."""

from __future__ import annotations

from itertools import cycle
from pathlib import Path

import pytest
from pytest_benchmark.fixture import BenchmarkFixture

from tests.benchmarks.timing import race, report
from workbench.evidence.ratio.at_once import Answer, AtOnce
from workbench.evidence.ratio.results import Average, Scan
from workbench.evidence.updating_ratio import scan
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.file.reading import read_analysis
from workbench.hypotheses.priors import Exponential, HalfNormal, Prior, Uniform
from workbench.records.files import write_record
from workbench.records.outcomes import Origin, ScanOutcome
from workbench.records.scan_reading import read_scan
from workbench.records.scan_record import scan_record

SKERRY = Path(__file__).parents[2] / "data" / "skerry" / "skerry.toml"
PRIORS: dict[str, Prior] = {"strength": Exponential(1.0), "mass": Uniform(30.0, 60.0)}

# Units of work (see timing.py). Set at about twice what was measured when this was written.
LIMITS = {"reprior": 36.0, "read": 20.0, "scan": 8000.0, "strength": 45.0, "mass": 160.0}
WANTED = 0.005  # seconds


@pytest.fixture(scope="module")
def skerry() -> Analysis:
    return read_analysis(SKERRY)


@pytest.fixture(scope="module")
def saved(skerry: Analysis, tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("records") / "scan.json"
    write_record(scan_record(ScanOutcome(skerry, Origin("skerry.toml", skerry.digest), scan(skerry))), path)
    return path


def test_another_prior_takes_milliseconds(
    saved: Path, benchmark: BenchmarkFixture, capsys: pytest.CaptureFixture[str]
) -> None:
    def first_time() -> Average:
        return read_fresh.pop().reprior(PRIORS)

    read_fresh: list[Scan] = [read_scan(saved) for _ in range(40)]
    found = race(benchmark, "another prior on a saved scan, nothing kept from before", first_time)
    report(capsys, found.text(WANTED))
    assert found.units < LIMITS["reprior"]


@pytest.mark.parametrize("moved", ["strength", "mass"])
def test_odds_and_density_follow_a_slider(
    skerry: Analysis, benchmark: BenchmarkFixture, capsys: pytest.CaptureFixture[str], moved: str
) -> None:
    priors: dict[str, list[Prior]] = {
        "strength": [HalfNormal(1.0 + 0.02 * step) for step in range(40)],
        "mass": [Uniform(30.0, 60.0 + 0.1 * step) for step in range(40)],
    }
    asked, steps = AtOnce(scan(skerry)), cycle(priors[moved])
    asked.under()

    def next_step() -> Answer:
        return asked.under({moved: next(steps)})

    found = race(benchmark, f"odds and density of the strength, prior of the {moved} moved", next_step)
    report(capsys, found.text())
    assert found.units < LIMITS[moved]


def test_reading_a_saved_scan_takes_milliseconds(
    saved: Path, benchmark: BenchmarkFixture, capsys: pytest.CaptureFixture[str]
) -> None:
    found = race(benchmark, "reading a saved scan", lambda: read_scan(saved))
    report(capsys, found.text(), f"{saved.stat().st_size / 1024:.0f} kB")
    assert found.units < LIMITS["read"]


def test_a_scan_takes_no_longer_than_expected(
    skerry: Analysis, benchmark: BenchmarkFixture, capsys: pytest.CaptureFixture[str]
) -> None:
    found = race(benchmark, "scan of strength and mass", lambda: scan(skerry), rounds=3)
    report(capsys, found.text())
    assert found.units < LIMITS["scan"]
