"""Uncertainties frozen and doubled, against analyses that say the same in other words."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from tests.analyses import everything
from tests.evidence.ledger import enumerated
from tests.evidence.small_analyses import counting, several_bins, source, templates
from workbench.evidence.ledger.doubling import doubled_source
from workbench.evidence.ledger.freedoms import doubled, freedoms_of, frozen
from workbench.evidence.ledger.ledger import ledger
from workbench.evidence.ledger.results import Hold
from workbench.evidence.weigh import weigh
from workbench.hypotheses.analysis import Analysis, Exposure
from workbench.hypotheses.distortion import Distortion
from workbench.hypotheses.priors import Exponential, Gamma, LogUniform
from workbench.likelihood.model import compile_model

SIGNAL = "signal plus background"


def holds(analysis: Analysis) -> dict[str, Hold]:
    (account,) = ledger(analysis, by=("uncertainties",)).accounts
    assert account.bins == ()
    assert account.shares is None
    return {hold.name: hold for hold in account.uncertainties}


def ln_bayes_factor(analysis: Analysis) -> tuple[float, float]:
    (comparison,) = weigh(analysis, seed=7).comparisons
    assert comparison.ln_bayes_factor is not None
    return comparison.ln_bayes_factor, comparison.ln_bayes_factor_error or 0.0


def agrees(value: float | None, error: float | None, other: tuple[float, float]) -> bool:
    assert value is not None
    assert error is not None
    return abs(value - other[0]) < 4.0 * float(np.hypot(error, other[1])) + 1e-9


def test_a_source_twice_as_large_is_what_quadrature_sums() -> None:
    found = holds(enumerated.analysis())
    exact = enumerated.ln_bayes_factor((0, 1, 2, 3), sd=2.0)
    size = found["size"]
    assert size.kind == "source"
    assert agrees(size.doubled, size.doubled_error, (exact, 0.0))
    assert abs(exact - enumerated.ln_bayes_factor((0, 1, 2, 3))) > 0.1


def test_a_source_frozen_is_a_source_left_out() -> None:
    analysis = enumerated.analysis()
    without = replace(analysis, uncertainties=analysis.uncertainties[1:])
    size = holds(analysis)["size"]
    assert agrees(size.frozen, size.frozen_error, ln_bayes_factor(without))


def test_a_source_of_one_number_doubled_is_the_factor_squared() -> None:
    """(1 + r)**(2 z) = ((1 + r)**2)**z: an independent route to twice the size."""
    region = several_bins("r", [14.0, 22.0], {"background": [10.0, 15.0], "signal": [1.0, 6.0]})
    small, large = (
        templates(region, uncertainties=(source("size", background=r),)) for r in (0.2, 1.2**2 - 1.0)
    )
    size = holds(small)["size"]
    assert agrees(size.doubled, size.doubled_error, ln_bayes_factor(large))


def test_a_nuisance_parameter_is_held_at_its_median_and_its_prior_widened() -> None:
    prior = Gamma(shape=9.0, rate=1.5)
    level = holds(counting(9, prior, Exponential(1.0), control=14))["level"]
    assert level.kind == "nuisance parameter"
    known = counting(9, float(prior.median), Exponential(1.0), control=14)
    assert agrees(level.frozen, level.frozen_error, ln_bayes_factor(known))
    wide = counting(9, Gamma(shape=2.25, rate=0.375), Exponential(1.0), control=14)
    assert agrees(level.doubled, level.doubled_error, ln_bayes_factor(wide))


def test_the_exposures_uncertainty_can_be_frozen() -> None:
    analysis = replace(enumerated.analysis(), exposure=Exposure(1.0, "d", 0.2))
    found = holds(analysis)
    assert agrees(
        found["exposure"].frozen, found["exposure"].frozen_error, ln_bayes_factor(enumerated.analysis())
    )


def test_an_uncertainty_that_only_one_hypothesis_uses_changes_only_that_one() -> None:
    region = several_bins("r", [14.0, 22.0], {"background": [10.0, 15.0], "signal": [1.0, 6.0]})
    analysis = templates(region, uncertainties=(source("yield", signal=0.3),))
    found = holds(analysis)["yield"]
    exact = ln_bayes_factor(templates(region))
    assert agrees(found.frozen, found.frozen_error, exact)


def test_a_distortion_is_frozen_as_a_whole() -> None:
    """Its terms are one uncertainty; without them the hypothesis is the undistorted one."""
    analysis = enumerated.analysis()
    zero, one = analysis.hypotheses
    neither = replace(zero, name="neither", distortion=Distortion(0.1, terms=2))
    distorted = replace(analysis, hypotheses=(zero, neither))
    (account,) = ledger(distorted, by=("uncertainties",)).accounts
    hold = {item.name: item for item in account.uncertainties}["smooth distortion"]
    assert hold.kind == "distortion"
    assert agrees(hold.frozen, hold.frozen_error, (0.0, 0.0))
    assert len(account.uncertainties) == 3
    assert one.distortion is None


def test_twice_as_large_is_every_factor_squared() -> None:
    """Numbers, two-sided numbers, template variations: at any z the factor is squared."""
    analysis = everything(template_errors=False)
    for name in ("size", "soft size", "soft shape", "exposure"):
        model, larger = (compile_model(one, SIGNAL) for one in (analysis, doubled_source(analysis, name)))
        index = model.names.index(name)
        points = np.zeros((5, model.size))
        nominal = model.by_process(model.seeds(points))
        points[:, index] = [-2.0, -0.7, 0.1, 1.0, 2.5]
        before, after = (one.by_process(one.seeds(points)) for one in (model, larger))
        moved = 0
        for process, events in nominal.items():
            filled = events > 0.0
            squared = np.where(filled, before[process] ** 2 / np.where(filled, events, 1.0), 0.0)
            np.testing.assert_allclose(after[process], squared, rtol=1e-10, atol=1e-12)
            moved += int((before[process] != events).sum())
        assert moved > 0


def test_additive_bins_of_a_variation_move_twice_as_far() -> None:
    """Where a template or a variation is empty, events are added: N + (U - D) z/2 + ..., linear in U - N."""
    analysis = everything(template_errors=False)
    model, larger = (
        compile_model(one, SIGNAL) for one in (analysis, doubled_source(analysis, "gappy shape"))
    )
    index = model.names.index("gappy shape")
    points = np.zeros((1, model.size))
    nominal, still = (one.by_process(one.seeds(points))["gappy"] for one in (model, larger))
    np.testing.assert_allclose(still, nominal, rtol=1e-6)
    points[:, index] = 1.0
    before, after = (one.by_process(one.seeds(points))["gappy"] for one in (model, larger))
    grown = (nominal < 1e-3) & (before > 0.1)
    np.testing.assert_allclose(after[grown], 2.0 * before[grown], rtol=1e-4)
    assert grown.any()


@pytest.mark.parametrize("name", ["size", "soft shape", "gappy shape"])
def test_derivatives_follow_what_is_doubled(name: str) -> None:
    """A fixed fault: a wider prior in place of a larger effect left the derivatives as they were."""
    analysis = everything()
    model = compile_model(analysis, SIGNAL)
    freedom = next(one for one in freedoms_of(model) if one.name == name)
    larger = doubled(model, freedom)
    assert larger is not None
    assert larger.observed is not None
    points = np.random.default_rng(2).normal(0.0, 0.7, (4, larger.size))
    _, gradient, _ = larger.derivatives(larger.seeds(points), larger.observed)
    step = np.zeros(larger.size)
    step[freedom.place] = 1e-5
    up, down = (
        larger.ln_likelihood(larger.seeds(points + sign * step), larger.observed) for sign in (1.0, -1.0)
    )
    np.testing.assert_allclose(gradient[:, freedom.place], (up - down) / 2e-5, rtol=1e-4, atol=1e-4)


def test_a_signal_parameter_is_no_uncertainty() -> None:
    model = compile_model(enumerated.analysis(), SIGNAL)
    assert [one.name for one in freedoms_of(model)] == ["size", "tilt"]
    assert frozen(model, freedoms_of(model)[0]).uncertainties == model.analysis.uncertainties[1:]


def test_a_prior_without_a_width_is_not_doubled() -> None:
    analysis = counting(9, LogUniform(1.0, 20.0), Exponential(1.0))
    level = holds(analysis)["level"]
    assert level.frozen is not None
    assert level.doubled is None
    assert level.doubled_error is None


def test_what_can_not_be_doubled_is_left_out() -> None:
    """A factor of 2,000 squared is beyond the largest that is worked with."""
    region = several_bins("r", [14.0], {"background": [10.0], "signal": [1.0]})
    model = compile_model(templates(region, uncertainties=(source("size", signal=2000.0),)), SIGNAL)
    (freedom,) = freedoms_of(model)
    assert doubled(model, freedom) is None
