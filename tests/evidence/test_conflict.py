"""Counts that ask for a strength which its prior had hardly expected."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import integrate, stats

from tests.evidence.small_analyses import YIELD, counting
from workbench.evidence.weigh import weigh
from workbench.hypotheses.priors import Exponential, HalfNormal, LogNormal, Prior

BACKGROUND = 60.0


def by_quadrature(observed: int, prior: Prior) -> float:
    """Return the ln evidence by scipy's adaptive quadrature over the strength, scaled by its own top."""

    def ln_density(strength: float) -> float:
        expected = BACKGROUND + YIELD * strength
        return float(stats.poisson.logpmf(observed, expected) + prior.ln_density(np.array(strength)))

    places = np.linspace(1e-3, 60.0, 20_000)
    heights = np.array([ln_density(place) for place in places])
    top, best = heights.max(), places[int(np.argmax(heights))]
    value = integrate.quad(
        lambda x: np.exp(ln_density(x) - top), 0.0, 80.0, points=[0.8 * best, best, 1.2 * best], limit=500
    )[0]
    return float(top + np.log(value))


@pytest.mark.parametrize(
    "prior", [LogNormal(1.0, 1.3), LogNormal(0.5, 1.2), HalfNormal(0.5), Exponential(0.3)]
)
@pytest.mark.parametrize("observed", [90, 200])
def test_an_evidence_far_from_what_the_prior_expected_is_found_there(prior: Prior, observed: int) -> None:
    """The strength's range ended at 9.6 standard deviations: an established ln evidence was 2.0 too small."""
    found = weigh(counting(observed, BACKGROUND, prior), closed_forms=False).evidences[1]
    assert found.established
    assert found.ln_evidence is not None
    assert found.error is not None
    assert abs(found.ln_evidence - by_quadrature(observed, prior)) < 4.0 * found.error


def test_where_numbers_end_nothing_is_established() -> None:
    found = weigh(counting(5_000_000, 1000.0, LogNormal(1.0, 1.02)), closed_forms=False).evidences[1]
    assert not found.established
