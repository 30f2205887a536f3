"""The likelihood with and without derivatives, fits, an ensemble for adequacy: Skerry, its mass unknown."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from pytest_benchmark.fixture import BenchmarkFixture

from tests.benchmarks.timing import race, report
from workbench.ensembles.adequacy import adequacy
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.file.reading import read_analysis
from workbench.likelihood.fit import fit
from workbench.likelihood.model import compile_model
from workbench.likelihood.objective import StandardObjective

SKERRY = Path(__file__).parents[2] / "data" / "skerry"
POINTS = 1024

# Units of work (see timing.py). Set at about twice what was measured when this was written.
LIMITS = {"value": 12.0, "derivatives": 80.0, "fit": 120.0, "adequacy": 500.0}


@pytest.fixture(scope="module")
def skerry() -> Analysis:
    return read_analysis(SKERRY / "skerry.toml")


@pytest.mark.parametrize("what", ["value", "derivatives"])
def test_a_thousand_points_take_a_few_units_of_work(
    what: str, skerry: Analysis, benchmark: BenchmarkFixture, capsys: pytest.CaptureFixture[str]
) -> None:
    model = compile_model(skerry, "resonance")
    objective = StandardObjective(model)
    points = np.random.default_rng(1).standard_normal((POINTS, model.size))
    counts = model.observed
    found = race(benchmark, f"{what} at {POINTS:,} points", lambda: getattr(objective, what)(points, counts))
    report(capsys, found.text(), f"a point: {1e6 * found.fastest / POINTS:.1f} us")
    assert found.units < LIMITS[what]


def test_fits_of_both_hypotheses_take_no_longer_than_expected(
    skerry: Analysis, benchmark: BenchmarkFixture, capsys: pytest.CaptureFixture[str]
) -> None:
    def both() -> None:
        for hypothesis in skerry.hypotheses:
            fit(skerry, hypothesis.name, asymmetric=False)

    found = race(benchmark, "fits of both hypotheses, without asymmetric errors", both)
    report(capsys, found.text())
    assert found.units < LIMITS["fit"]


def test_adequacy_of_both_hypotheses_with_200_pseudo_experiments_takes_no_longer_than_expected(
    skerry: Analysis, benchmark: BenchmarkFixture, capsys: pytest.CaptureFixture[str]
) -> None:
    def both() -> None:
        for hypothesis in skerry.hypotheses:
            found = adequacy(skerry, hypothesis.name, most=200)
            assert found.pseudo_experiments == 200

    found = race(benchmark, "adequacy of both hypotheses, 200 pseudo-experiments each", both, rounds=7)
    report(capsys, found.text(), f"a refitted pseudo-experiment: {1e6 * found.fastest / 400:.0f} us")
    assert found.units < LIMITS["adequacy"]
