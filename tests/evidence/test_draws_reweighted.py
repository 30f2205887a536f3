"""Another prior of the strength from draws that stand: the closed form under that prior, or no answer."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import numpy.typing as npt
import pytest
from scipy import special

from workbench.evidence.drawn import Drawn, nothing_drawn
from workbench.evidence.draws_reweighted import ln_change_of_draws
from workbench.hypotheses.priors import Exponential, Prior, Uniform

Array = npt.NDArray[np.float64]

COUNT = 60_000


def posterior_of_count(count: int, declared: Prior) -> Drawn:
    """Return draws from the prior, weighted by the probability of a count of mean x."""
    generator = np.random.default_rng(6)
    points = generator.standard_normal((COUNT, 2))
    mean = declared.from_standard(points[:, 1])[0]
    ln_weights = count * np.log(mean) - mean - special.gammaln(count + 1.0)
    return replace(nothing_drawn("annealing", 2, ""), points=points, ln_weights=ln_weights)


def exact(count: int, prior: Prior) -> float:
    """Return ln of the prior's average probability of a count; by hand."""
    if isinstance(prior, Exponential):
        return float(-(count + 1) * np.log1p(1.0 / prior.mean) - np.log(prior.mean))
    low, high = prior.support
    return float(
        np.log((special.gammainc(count + 1, high) - special.gammainc(count + 1, low)) / (high - low))
    )


@pytest.mark.parametrize(
    ("declared", "other"),
    [
        (Exponential(4.0), Exponential(8.0)),
        (Exponential(4.0), Exponential(2.0)),
        (Uniform(0.0, 20.0), Uniform(0.0, 10.0)),
        (Uniform(0.0, 20.0), Uniform(0.0, 40.0)),
    ],
    ids=lambda prior: prior.text(),
)
def test_the_change_is_that_of_the_closed_forms(declared: Prior, other: Prior) -> None:
    found = ln_change_of_draws(posterior_of_count(4, declared), 1, declared, other)
    expected = exact(4, other) - exact(4, declared)
    assert found == pytest.approx(expected, abs=0.03)
    assert abs(expected) > 0.1


def test_a_prior_that_reaches_where_no_draw_is_has_no_answer() -> None:
    """15 counts and a mean below 8: most of what a wider prior would add lies beyond."""
    declared = Uniform(0.0, 8.0)
    assert ln_change_of_draws(posterior_of_count(15, declared), 1, declared, Uniform(0.0, 16.0)) is None


def test_too_few_draws_under_another_prior_give_no_answer() -> None:
    declared = Uniform(0.0, 100.0)
    assert ln_change_of_draws(posterior_of_count(60, declared), 1, declared, Uniform(0.0, 1.0)) is None
    assert ln_change_of_draws(nothing_drawn("annealing", 2, ""), 1, declared, Uniform(0.0, 1.0)) is None
