"""Stated errors of the updating ratio against direct evaluations, over random analyses; seeds are fixed."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from tests.evidence.small_analyses import bump, counting, source
from workbench.evidence.ratio.results import Check
from workbench.evidence.updating_ratio import scan
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.priors import Exponential, Gamma, Uniform

ANALYSES = 14


def invented(seed: int) -> Analysis:
    """Return a bump of random size on a continuum of 8 to 2,000 events, or an on/off count."""
    drawn = np.random.default_rng(seed)
    sources = (
        source("size", continuum=float(drawn.uniform(0.02, 0.2))),
        source("tilt", continuum=(float(drawn.uniform(0.02, 0.1)), -float(drawn.uniform(0.02, 0.1)))),
        source("efficiency", peak=(0.12, -0.08)),
    )
    if seed % 4 == 0:
        off = float(drawn.poisson(12.0))
        return counting(float(drawn.poisson(9.0)), Gamma(1.5, 0.3), Exponential(1.0), off)
    continuum = float(np.exp(drawn.uniform(np.log(8.0), np.log(2000.0))))
    signal = float(drawn.uniform(0.0, 6.0) * np.sqrt(1.0 + continuum / 20.0))
    edges = np.linspace(0.0, 20.0, 41)
    falling = -np.expm1(-edges / 8.0) / -np.expm1(-20.0 / 8.0)
    where = float(drawn.uniform(2.0, 18.0))
    expected = continuum * np.diff(falling) + signal * np.diff(stats.norm.cdf(edges, where, 0.4))
    counts = drawn.poisson(expected).astype(float)
    return bump(
        counts, continuum=continuum, events=max(signal, 4.0), strength=Uniform(0.0, 4.0),
        uncertainties=sources,
    )  # fmt: skip


@pytest.fixture(scope="module")
def checks() -> list[Check]:
    found: list[Check] = []
    for seed in range(1, ANALYSES + 1):
        one = scan(invented(seed), seed=seed)
        assert one.established, one.reason
        found += one.checks
    return found


def test_pulls_against_the_engine_with_the_parameters_held_are_no_wider_than_a_normal(
    checks: list[Check],
) -> None:
    """8 points each, between the nodes; the engine's own error counts. The bound is one-sided: 1 in 1,000."""
    pulls = np.array([one.pull for one in checks])
    assert len(pulls) >= 8 * ANALYSES - 8
    assert (pulls**2).sum() < stats.chi2(len(pulls)).isf(1e-3)
    assert (np.abs(pulls) > 2.0).sum() <= stats.binom(len(pulls), 0.0455).isf(1e-3)
    wrong = np.array([(one.ln_ratio + 0.02 - one.direct) for one in checks])
    errors = np.hypot([one.error for one in checks], [one.direct_error for one in checks])
    assert ((wrong / errors) ** 2).sum() > stats.chi2(len(pulls)).isf(1e-3), "0.02 nats off shows"


def test_the_errors_are_small_enough_to_be_of_use(checks: list[Check]) -> None:
    assert np.median([one.error for one in checks]) < 0.01
