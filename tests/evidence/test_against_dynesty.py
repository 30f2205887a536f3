"""Evidences against nested sampling: another algorithm, in the same standard-normal coordinates.

Reference: dynesty (J.S. Speagle, MNRAS 493 (2020) 3132); its own error is a few tenths with few live points.
"""

from __future__ import annotations

from collections.abc import Callable

import dynesty
import numpy as np
import numpy.typing as npt
import pytest
from scipy import special

from tests.evidence.small_analyses import bump, several_bins, source, templates
from workbench.evidence.weigh import weigh
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.priors import Exponential, HalfNormal
from workbench.likelihood.model import compile_model

Array = npt.NDArray[np.float64]

SIGNAL = "signal plus background"
EDGES = np.linspace(0.0, 20.0, 21)


def with_five_sources() -> Analysis:
    """Return a peak on two backgrounds with sources on everything, one of them two-sided."""
    columns = {
        "first": [30.0, 24.0, 18.0, 13.0, 9.0],
        "second": [4.0, 6.0, 8.0, 6.0, 4.0],
        "signal": [0.5, 3.0, 8.0, 3.0, 0.5],
    }
    sources = (
        source("first size", first=0.15),
        source("second size", second=0.4),
        source("scale", first=0.05, second=0.05, signal=0.05),
        source("efficiency", second=(0.1, -0.05), signal=(0.15, -0.1)),
        source("signal size", signal=0.2),
    )
    return templates(several_bins("r", [33.0, 36.0, 41.0, 19.0, 12.0], columns), HalfNormal(1.5), sources)


def with_template_errors() -> Analysis:
    """Return templates from a small simulation, so that bins are negative binomial."""
    region = several_bins(
        "r",
        [7.0, 12.0, 3.0, 2.0],
        {"background": [5.0, 4.0, 3.0, 2.0], "signal": [1.0, 4.0, 1.0, 0.0]},
        {"background": [1.5, 1.2, 1.0, 0.9], "signal": [0.1, 0.3, 0.1, 0.0]},
        template_errors=True,
    )
    return templates(region, Exponential(1.0), (source("size", background=0.3, signal=0.1),))


def with_unknown_mass() -> Analysis:
    """Return a peak of unknown mass and strength on a continuum with an uncertain size."""
    continuum = 200.0 * -np.diff(np.exp(-EDGES / 8.0)) / -np.expm1(-20.0 / 8.0)
    peak = 20.0 * np.diff(special.ndtr((EDGES - 9.0) / 0.8))
    counts = np.round(continuum + peak)
    return bump(
        counts,
        bins=20,
        resolution=0.8,
        continuum=200.0,
        strength=Exponential(1.5),
        uncertainties=(source("size", continuum=0.1),),
    )


def nested(analysis: Analysis, live: int = 100) -> tuple[float, float]:
    """Return ln evidence and its error by nested sampling over standard-normal coordinates."""
    model = compile_model(analysis, SIGNAL)
    counts = model.observed
    assert counts is not None

    def ln_likelihood(point: Array) -> float:
        return float(model.ln_likelihood(model.seeds(np.asarray(point)[None]), counts)[0])

    sampler = dynesty.NestedSampler(
        ln_likelihood, special.ndtri, model.size, nlive=live, rstate=np.random.default_rng(17), sample="rwalk"
    )
    sampler.run_nested(print_progress=False, dlogz=0.1)
    return float(sampler.results.logz[-1]), float(sampler.results.logzerr[-1])


@pytest.mark.slow
@pytest.mark.parametrize("declared", [with_five_sources, with_template_errors, with_unknown_mass])
def test_nested_sampling_agrees_within_three_combined_errors(declared: Callable[[], Analysis]) -> None:
    analysis = declared()
    evidence = weigh(analysis).evidences[1]
    assert evidence.established
    assert evidence.ln_evidence is not None
    assert evidence.error is not None
    found, error = nested(analysis)
    assert error < 0.5
    assert abs(found - evidence.ln_evidence) < 3.0 * np.hypot(error, evidence.error)
    # Nested sampling is the loose side of this comparison.
    assert evidence.error < 0.05 * error
