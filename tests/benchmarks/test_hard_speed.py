"""Hard analyses against the clock, and how cost grows with bins and with sources."""

from __future__ import annotations

import numpy as np
import pytest
from pytest_benchmark.fixture import BenchmarkFixture

from tests.benchmarks.hard_analyses import many_sources, narrow_line
from tests.benchmarks.test_evidence_speed import both_evidences
from tests.benchmarks.timing import race, report, timed
from workbench.hypotheses.analysis import Analysis
from workbench.likelihood.fit import fit


def fit_and_both_evidences(analysis: Analysis) -> None:
    """Fit signal plus background and weigh both hypotheses."""
    fit(analysis, "signal plus background")
    both_evidences(analysis)


@pytest.mark.parametrize("injected", [0.0, 3.0], ids=["nothing there", "a line there"])
def test_a_narrow_line_over_400_bins(
    injected: float, benchmark: BenchmarkFixture, capsys: pytest.CaptureFixture[str]
) -> None:
    analysis = narrow_line(injected=injected)
    found = race(benchmark, "narrow line, both evidences", lambda: both_evidences(analysis), rounds=5)
    one = both_evidences(analysis)[1]
    assert one.grid is not None
    nodes = one.grid.columns.outer.shape[0]
    report(capsys, found.text(0.400), f"{nodes:,} masses, ln error {one.evidence.error:.4f}")
    assert one.evidence.established
    assert nodes > 800  # one a resolution at the very least
    assert found.units < 4000.0


@pytest.mark.parametrize("by_bin", [0, 100, 200])
def test_5000_bins_and_200_sources(
    by_bin: int, benchmark: BenchmarkFixture, capsys: pytest.CaptureFixture[str]
) -> None:
    analysis = many_sources(5000, 200, by_bin=by_bin)
    name = f"5,000 bins, 200 sources, {by_bin} of them by bin: fit and both evidences"
    found = race(benchmark, name, lambda: fit_and_both_evidences(analysis), rounds=3)
    evidences = [one.evidence for one in both_evidences(analysis)]
    errors = " and ".join(f"{one.error:.4f}" for one in evidences)
    report(capsys, found.text(2.0), f"ln errors {errors}")
    assert all(one.established for one in evidences), [one.reason for one in evidences]
    assert found.units < 16000.0


def exponent(sizes: list[int], analyses: list[Analysis]) -> tuple[float, list[float]]:
    """Return the power with which the time of fit and evidences grows, and the fastest times [s]."""

    def fastest(analysis: Analysis) -> float:
        return min(timed(lambda: fit_and_both_evidences(analysis)) for _ in range(3))

    times = [fastest(one) for one in analyses]
    return float(np.polyfit(np.log(sizes), np.log(times), 1)[0]), times


def test_cost_grows_linearly_in_bins_and_at_most_quadratically_in_sources(
    capsys: pytest.CaptureFixture[str],
) -> None:
    bins, sources = [1250, 2500, 5000, 10_000], [25, 50, 100, 200]
    in_bins, bin_times = exponent(bins, [many_sources(one, 50, by_bin=25) for one in bins])
    in_sources, source_times = exponent(
        sources, [many_sources(2500, one, by_bin=one // 2) for one in sources]
    )
    report(
        capsys,
        f"bins {bins}: {' '.join(f'{one:.2f}' for one in bin_times)} s, exponent {in_bins:.2f}",
        f"sources {sources}: {' '.join(f'{one:.2f}' for one in source_times)} s, exponent {in_sources:.2f}",
    )
    assert in_bins < 1.25
    assert in_sources < 2.1
