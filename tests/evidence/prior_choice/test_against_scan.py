"""Two ways to R(strength): evidences with it held one by one, and one surface that shares its draws."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from workbench.evidence.prior_choice.averages import average
from workbench.evidence.prior_choice.tracing import trace
from workbench.evidence.updating_ratio import scan
from workbench.evidence.weigh import weigh
from workbench.hypotheses.file.reading import read_analysis
from workbench.hypotheses.priors import Exponential, Gamma, HalfNormal, Prior, Uniform

DATA = Path(__file__).parents[3] / "data"
PRIORS: tuple[Prior, ...] = (
    Uniform(0.0, 4.0),
    Uniform(0.0, 2.0),
    Exponential(0.4),
    HalfNormal(1.0),
    Gamma(3.0, 2.5),
)


@pytest.mark.parametrize("file", ["skerry/skerry-fixed-mass.toml", "skerry/skerry.toml"])
def test_both_average_to_the_same_bayes_factors(file: str) -> None:
    analysis = read_analysis(DATA / file)
    surface = scan(analysis, ["strength"])
    name, against = analysis.hypotheses[1].name, weigh(analysis).evidences[0]
    curve = trace(analysis, name, "strength", against, np.random.SeedSequence(4), is_nested=True, scale=2.0)
    for prior in PRIORS:
        one, other = average(curve, prior), surface.reprior({"strength": prior})
        assert one.ln_bayes_factor is not None
        assert one.error is not None
        gap = abs(one.ln_bayes_factor - other.ln_bayes_factor)
        assert gap < 4.0 * float(np.hypot(one.error, other.error)), prior.text()
