"""Bayes factors of an updating ratio under priors that it was not made with."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy import special, stats

from tests.evidence.ratio.bumps import STRENGTH_PRIORS, TO_FIVE, read, uncertain_bump
from tests.evidence.small_analyses import YIELD, counting
from workbench.errors import InputError
from workbench.evidence.ratio.results import Scan
from workbench.evidence.updating_ratio import scan
from workbench.evidence.weigh import weigh
from workbench.hypotheses.analysis import Parameter
from workbench.hypotheses.priors import (
    Beta,
    Exponential,
    Fixed,
    Gamma,
    HalfNormal,
    LogNormal,
    LogUniform,
    Normal,
    Prior,
    Uniform,
)


@pytest.fixture(scope="module")
def bumps() -> Scan:
    return scan(uncertain_bump(), seed=3)


FAMILIES: list[tuple[Prior, Prior]] = [
    (Exponential(1.0), Uniform(4.0, 12.0)),
    (HalfNormal(1.5), Normal(7.0, 0.6)),
    (Gamma(2.0, 2.0), Uniform(1.0, 19.0)),
    (LogUniform(0.05, 5.0), Normal(10.0, 2.0, 3.0, 18.0)),
    (LogNormal(1.5, 1.3), Uniform(7.0, 7.4)),
    (Beta(2.0, 3.0, 0.0, 4.0), Beta(1.0, 1.0, 2.0, 18.0)),
]


@pytest.mark.parametrize(("strength", "mass"), FAMILIES)
def test_another_prior_gives_what_weighing_under_it_gives(bumps: Scan, strength: Prior, mass: Prior) -> None:
    """`weigh` integrates anew under each prior; both errors count."""
    found = bumps.reprior({"strength": strength, "mass": mass})
    base = uncertain_bump()
    other = replace(base, parameters=(Parameter("strength", strength), Parameter("mass", mass)))
    comparison = weigh(other, seed=11).comparisons[0]
    assert comparison.ln_bayes_factor is not None
    assert comparison.ln_bayes_factor_error is not None
    error = float(np.hypot(found.error, comparison.ln_bayes_factor_error))
    assert abs(found.ln_bayes_factor - comparison.ln_bayes_factor) < 4.0 * error
    assert found.error < 0.03
    stated = bumps.reprior().ln_bayes_factor
    assert abs(found.ln_bayes_factor - stated) > 4.0 * error, "the negative control: the prior matters"


@pytest.mark.parametrize("prior", STRENGTH_PRIORS)
def test_the_average_over_a_prior_is_that_of_a_closed_form(prior: Prior) -> None:
    """R = Poisson(9 | 3 + 6 s)/Poisson(9 | 3) summed in 20,000 steps of equal prior probability."""
    found = scan(counting(9.0, 3.0, TO_FIVE)).reprior({"strength": prior})
    strength = prior.quantile((np.arange(20_000) + 0.5) / 20_000)
    ln_ratio = stats.poisson.logpmf(9, 3.0 + YIELD * strength) - stats.poisson.logpmf(9, 3.0)
    exact = special.logsumexp(ln_ratio) - np.log(20_000)
    assert abs(found.ln_bayes_factor - exact) < 3.0 * found.error
    assert found.error < 0.005


def test_a_prior_that_is_one_number_gives_r_there(bumps: Scan) -> None:
    found = bumps.reprior({"strength": Fixed(1.3), "mass": Fixed(7.2)})
    ln_ratio, error = read(bumps, (1.3, 7.2))
    assert found.ln_bayes_factor == pytest.approx(ln_ratio[0], abs=1e-9)
    assert found.error >= error[0]


@pytest.mark.parametrize(
    ("priors", "words"),
    [
        ({"strength": Uniform(0.0, 30.0)}, "reaches outside the range in which R is known"),
        ({"strength": Exponential(4.0)}, "8.21 % of it outside"),
        ({"mass": Uniform(0.5, 10.0)}, "0 to 19"),
        ({"mass": Normal(18.0, 1.0)}, "cut it off there"),
        ({"mas": Uniform(2.0, 3.0)}, 'write "mass"'),
        ({"size": Normal(0.0, 1.0)}, "not known over"),
    ],
)
def test_priors_that_nothing_is_known_for_are_refused(
    bumps: Scan, priors: dict[str, Prior], words: str
) -> None:
    with pytest.raises(InputError) as caught:
        bumps.reprior(priors)
    text = "\n".join(problem.text() for problem in caught.value.problems)
    assert words.replace("0 to 19", "1 to 19") in text


def test_a_prior_of_what_was_averaged_over_is_refused_and_all_problems_are_told_at_once() -> None:
    found = scan(uncertain_bump(), ("mass",), seed=3)
    with pytest.raises(InputError) as caught:
        found.reprior({"strength": Exponential(1.0), "mass": Uniform(0.0, 40.0)})
    first, second = caught.value.problems
    assert first.what == "A prior of a parameter that was averaged over"
    assert 'scan over "strength" too' in first.remedy
    assert "reaches outside" in second.what
