"""Power-scaling of nuisance priors, against conjugate posteriors and evidences in closed form."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
import numpy.typing as npt
import pytest
from scipy import stats

from tests.evidence.small_analyses import TAU, counting, source
from workbench.evidence.prior_choice import power_scaling as module
from workbench.evidence.prior_choice.power_scaling import Draws, draws_of, driver, power_scaling
from workbench.evidence.prior_choice.powers import Driver, PowerScaling
from workbench.evidence.weigh import weigh, weigh_hypothesis
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.priors import Exponential, Gamma, Normal, Prior, Uniform
from workbench.likelihood.model import compile_model

NULL, BOTH = "background only", "signal plus background"
Array = npt.NDArray[np.float64]
Law = Any  # a frozen distribution of scipy.stats
LEVEL = Gamma(4.0, 0.7)


def draws(analysis: Analysis, hypothesis: str, seed: int = 5) -> Draws:
    child = np.random.SeedSequence(seed)
    weighed = weigh_hypothesis(compile_model(analysis, hypothesis), child, closed_forms=False)
    found = draws_of(weighed, np.random.SeedSequence(seed + 1))
    assert found is not None
    return found


def scaled(analysis: Analysis, name: str, hypothesis: str = BOTH) -> PowerScaling:
    against = draws(analysis, NULL) if hypothesis != NULL else None
    found = power_scaling(draws(analysis, hypothesis), against)
    return next(one for one in found if one.parameter == name)


def on_off(level: Prior, observed: float = 9, control: float = 20) -> Analysis:
    return counting(observed, level, Exponential(1.0), control=control)


def with_level(analysis: Analysis, prior: Prior) -> Analysis:
    return replace(
        analysis,
        parameters=tuple(replace(p, prior=prior) if p.name == "level" else p for p in analysis.parameters),
    )


def conjugate(power_of_prior: float, power_of_data: float) -> Law:
    """The background's posterior without signal: a gamma, with either part to a power."""
    counts, exposure = 29.0, 1.0 + TAU
    shape = power_of_prior * (LEVEL.shape - 1.0) + power_of_data * counts + 1.0
    return stats.gamma(shape, scale=1.0 / (power_of_prior * LEVEL.rate + power_of_data * exposure))


def distance(first: Law, second: Law) -> float:
    """The cumulative Jensen-Shannon distance on a dense grid of scipy's distribution functions."""
    x = np.linspace(float(first.ppf(1 / 4000)), float(first.ppf(1 - 1 / 4000)), 100_001)

    def one_way(a: Array, b: Array) -> float:
        middle = 0.5 * (a + b)
        inner = np.trapezoid(a * np.log2(a / middle) + b * np.log2(b / middle), x)
        return float(inner / np.trapezoid(a + b, x))

    p, q = first.cdf(x), second.cdf(x)
    return float(np.sqrt(max(one_way(p, q), one_way(1.0 - p, 1.0 - q))))


def test_sensitivities_are_those_of_the_conjugate_posterior() -> None:
    found = scaled(on_off(LEVEL), "level", NULL)
    step = 1.01
    base = conjugate(1.0, 1.0)
    for value, error, powers in (
        (found.by_prior, found.by_prior_error, ((step, 1.0), (1.0 / step, 1.0))),
        (found.by_data, found.by_data_error, ((1.0, step), (1.0, 1.0 / step))),
    ):
        expected = np.mean([distance(base, conjugate(*each)) for each in powers]) / np.log2(step)
        assert 0.0 < error < 0.01
        assert value == pytest.approx(expected, abs=4.0 * error + 0.03 * expected)
    # The negative control: the two sensitivities are not each other's.
    assert abs(found.by_prior - found.by_data) > 10.0 * max(found.by_prior_error, found.by_data_error)


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_ln_b_changes_as_the_closed_form_says(seed: int) -> None:
    """Powered by hand: gamma of shape a (k - 1) + 1 and rate a r; its evidences are finite sums."""
    analysis = on_off(LEVEL)
    found = power_scaling(draws(analysis, BOTH, seed), draws(analysis, NULL, seed))[0]
    before = weigh(analysis).comparisons[0].ln_bayes_factor
    for change, prior in zip(found.changes, (Gamma(2.5, 0.35), Gamma(7.0, 1.4)), strict=True):
        after = weigh(with_level(analysis, prior)).comparisons[0].ln_bayes_factor
        assert after is not None
        assert before is not None
        assert change.ln_change is not None
        assert change.error is not None
        assert change.k_hat is not None
        assert not change.is_fresh
        assert change.ln_change == pytest.approx(after - before, abs=4.0 * change.error + 5e-4)
        # The negative control: the sign is told apart.
        assert abs(change.ln_change + (after - before)) > 8.0 * change.error


def test_uneven_draws_are_not_used_and_the_evidence_is_made_again(monkeypatch: pytest.MonkeyPatch) -> None:
    analysis = on_off(LEVEL)
    monkeypatch.setattr(module, "largest_allowed", lambda draws: -np.inf)
    found = power_scaling(draws(analysis, BOTH), draws(analysis, NULL))[0]
    before = weigh(analysis).comparisons[0].ln_bayes_factor
    after = weigh(with_level(analysis, Gamma(2.5, 0.35))).comparisons[0].ln_bayes_factor
    assert after is not None
    assert before is not None
    change = found.changes[0]
    assert change.is_fresh
    assert change.error is not None
    assert change.ln_change == pytest.approx(after - before, abs=4.0 * change.error)


def test_a_source_that_is_pulled_far_is_made_again_by_itself() -> None:
    """A count of 60 on 20 +- 2 without signal: a prior as wide as sqrt 2 moves the posterior far away."""
    analysis = counting(60, 20.0, Exponential(1.0), uncertainties=(source("size", background=0.1),))
    found = scaled(analysis, "size", NULL)
    assert found.changes[0].k_hat is not None
    wider = source("size", background=1.1**2.0**0.5 - 1.0)
    wide = counting(60, 20.0, Exponential(1.0), uncertainties=(wider,))
    before, after = weigh(analysis).evidences[0], weigh(wide).evidences[0]
    assert after.ln_evidence is not None
    assert before.ln_evidence is not None
    assert found.changes[0].ln_change is not None
    assert found.changes[0].error is not None
    expected = after.ln_evidence - before.ln_evidence
    assert found.changes[0].ln_change == pytest.approx(expected, abs=4.0 * found.changes[0].error + 0.01)
    assert expected > 2.0


def test_what_drives_a_parameter_is_named() -> None:
    """By construction: a level that is measured, a source that nothing measures, and a clash."""
    measured = scaled(on_off(Gamma(1.2, 0.02), 30, 120), "level")
    assert measured.driver is Driver.DATA
    loose = counting(9, 5.0, Exponential(1.0), uncertainties=(source("unseen", background=0.02),))
    unseen = scaled(loose, "unseen")
    assert unseen.driver is Driver.PRIOR
    assert unseen.tension is None
    clash = scaled(on_off(Normal(10.0, 1.0, low=0.1), 22, 80), "level", NULL)
    assert clash.tension is not None
    assert clash.driver is Driver.CONFLICT


def test_a_tension_is_the_distance_of_prior_and_data_by_hand() -> None:
    """Normal prior 10 +- 1 against 80 counts in 4 exposures and 22 in one: 102/5 +- sqrt(102)/5."""
    found = scaled(on_off(Normal(10.0, 1.0, low=0.1), 22, 80), "level", NULL)
    data, error = 102.0 / 5.0, 102.0**0.5 / 5.0
    assert found.tension == pytest.approx((data - 10.0) / np.hypot(1.0, error), rel=0.25)


def test_a_flat_prior_has_no_power() -> None:
    found = scaled(on_off(Uniform(0.5, 40.0)), "level")
    assert found.driver is Driver.FLAT
    assert found.by_prior == 0.0
    assert [change.ln_change for change in found.changes] == [0.0, 0.0]


def test_names_follow_the_two_sensitivities() -> None:
    assert driver(0.01, 0.09, 0.3) is Driver.DATA
    assert driver(0.09, 0.01, None) is Driver.PRIOR
    assert driver(0.09, 0.09, -2.5) is Driver.CONFLICT
    assert driver(0.09, 0.09, 1.0) is Driver.BOTH
    assert driver(0.04, 0.04, 0.0) is Driver.BOTH


def test_an_improper_power_is_not_answered() -> None:
    found = scaled(on_off(Gamma(0.4, 0.1)), "level")
    assert found.changes[1].ln_change is None
    assert found.changes[0].ln_change is not None
