"""Closed forms of linear rates: against sums and integrals done in another way, and at their ends."""

from __future__ import annotations

from itertools import product

import numpy as np
import pytest
from scipy import integrate, special, stats

from tests.evidence.brute_force import panels
from tests.evidence.small_analyses import TAU, YIELD, counting, one_bin, several_bins, source, templates
from workbench.evidence.exact import LinearRates, linear_rates, ln_evidence, ln_moment
from workbench.evidence.weigh import weigh
from workbench.hypotheses.analysis import Analysis, Parameter
from workbench.hypotheses.priors import Exponential, Gamma, HalfNormal, Prior, Uniform
from workbench.hypotheses.processes import Contribution, Process
from workbench.hypotheses.shapes import Flat
from workbench.likelihood.model import compile_model


def ln_bayes_factor(analysis: Analysis) -> float:
    found = weigh(analysis).comparisons[0].ln_bayes_factor
    assert found is not None
    return found


@pytest.mark.parametrize("mean", [3.0, 10.0, 30.0])
@pytest.mark.parametrize("bins", [1, 5])
def test_zero_counts_everywhere_have_their_ceiling(mean: float, bins: int) -> None:
    """By hand: with an exponential prior of S expected signal events, no counts at all give B01 = 1 + S.

    The background, whatever it is, drops out.
    """
    region = several_bins("r", [0.0] * bins, {"b": [0.7] * bins, "signal": [mean / bins] * bins})
    assert np.exp(-ln_bayes_factor(templates(region, Exponential(1.0)))) == pytest.approx(
        1.0 + mean, rel=1e-12
    )


@pytest.mark.parametrize("level", [Gamma(2.0, 0.5), Gamma(40.0, 4.0), Exponential(100.0)])
@pytest.mark.parametrize("n_off", [0, 3, 50])
def test_zero_on_counts_give_a_bayes_factor_that_no_background_changes(level: Prior, n_off: int) -> None:
    """By hand: B10 = (r/(1 + r))^a for a gamma prior (a, r) on the signal events, r = 2/YIELD here."""
    analysis = counting(0, level, Gamma(shape=1.5, rate=2.0), control=n_off)
    rate = 2.0 / YIELD
    assert ln_bayes_factor(analysis) == pytest.approx(1.5 * np.log(rate / (1.0 + rate)), abs=1e-11)


@pytest.mark.parametrize(("n", "b"), [(0, 2.0), (3, 2.0), (9, 0.1), (25, 12.0)])
def test_a_known_background_is_the_sum_over_what_is_signal(n: int, b: float) -> None:
    """p(n) = sum_k Poisson(n - k; b) NB(k), the signal's count negative binomial: scipy.stats.nbinom."""
    a, r = 2.5, 2.0 / YIELD
    k = np.arange(n + 1)
    exact = np.log((stats.poisson.pmf(n - k, b) * stats.nbinom.pmf(k, a, r / (1.0 + r))).sum())
    found = weigh(counting(n, b, Gamma(shape=2.5, rate=2.0))).evidences[1]
    assert found.ln_evidence == pytest.approx(exact, abs=1e-11)
    assert (found.error, found.established) == (0.0, True)


@pytest.mark.parametrize(("n_on", "n_off"), [(0, 0), (4, 1), (1, 9), (12, 20)])
def test_on_and_off_counts_are_the_integral_over_both_rates(n_on: int, n_off: int) -> None:
    """Gauss-Legendre panels over background and signal: an independent route."""
    level = Gamma(shape=1.5, rate=0.4)
    root, weight = panels(0.0, 1.0, 2.0, 3.0, 5.0, 8.0)
    background, weight_b = root**2, 2.0 * root * weight  # the prior's own root at 0 is smooth in the root
    signal, weight_s = panels(0.0, 5.0, 20.0, 60.0, 160.0)
    on = stats.poisson.pmf(n_on, signal[:, None] + background)
    off = stats.poisson.pmf(n_off, TAU * background) * np.exp(level.ln_density(background))
    value = (weight_s * np.exp(-signal / YIELD) / YIELD) @ (on @ (off * weight_b))
    found = weigh(counting(n_on, level, Exponential(1.0), control=n_off)).evidences[1].ln_evidence
    assert found == pytest.approx(np.log(value), abs=1e-9)


def test_several_bins_and_rates_are_the_sum_over_every_split() -> None:
    """Brute force: each count of two bins split over two rates and a constant in nested loops."""
    rates = LinearRates(
        constant=np.array([0.4, 1.1]),
        slopes=np.array([[2.0, 0.5], [0.3, 1.7]]),
        priors=(Gamma(1.5, 0.8), Uniform(0.2, 3.0)),
    )
    counts = np.array([3.0, 2.0])

    def moment(slot: int, power: int) -> float:
        prior, damping = rates.priors[slot], rates.slopes[slot].sum()
        low, high = prior.support
        value, _ = integrate.quad(
            lambda x: x**power * np.exp(-damping * x + prior.ln_density(np.array([x]))[0]),
            low,
            min(high, 40.0),
            points=[1.0],
        )
        return float(value)

    moments = [[moment(slot, power) for power in range(6)] for slot in (0, 1)]
    total = 0.0
    for first in product(range(4), repeat=2):
        for second in product(range(3), repeat=2):
            term = 1.0
            for index, (a, b) in enumerate((first, second)):
                left = int(counts[index]) - a - b
                if left < 0:
                    term = 0.0
                    break
                weights = [rates.constant[index], *rates.slopes[:, index]]
                term *= np.exp(-weights[0])
                for weight, power in zip(weights, (left, a, b), strict=True):
                    term *= weight**power / special.factorial(power)
            total += term * moments[0][first[0] + second[0]] * moments[1][first[1] + second[1]]
    assert ln_evidence(rates, counts) == pytest.approx(np.log(total), abs=1e-9)


def test_probabilities_of_all_counts_add_up_to_one() -> None:
    rates = LinearRates(
        np.array([0.4, 0.1]), np.array([[0.5, 0.2], [0.1, 0.6]]), (Exponential(1.0), Uniform(0.0, 2.0))
    )
    total = 0.0
    for counts in product(range(14), repeat=2):
        found = ln_evidence(rates, np.array(counts, dtype=float))
        assert found is not None
        total += np.exp(found)
    assert total == pytest.approx(1.0, abs=1e-5)
    assert total < 1.0


@pytest.mark.parametrize("prior", [Gamma(2.5, 0.7), Exponential(3.0), Uniform(0.5, 4.0), Uniform(0.0, 9.0)])
@pytest.mark.parametrize(("power", "damping"), [(0, 0.0), (0, 2.0), (3, 0.5), (11, 6.0), (2, 0.0)])
def test_moments_are_their_integrals(prior: Prior, power: int, damping: float) -> None:
    high = min(prior.support[1], 150.0)
    value, _ = integrate.quad(
        lambda x: x**power * np.exp(-damping * x + prior.ln_density(np.array([x]))[0]),
        prior.support[0],
        high,
        points=[1.0, 2.0, 3.0],
        epsabs=0.0,
        limit=200,
    )
    assert ln_moment(prior, np.array(float(power)), damping) == pytest.approx(np.log(value), abs=1e-8)


def test_a_family_without_a_closed_form_is_refused() -> None:
    with pytest.raises(TypeError, match="halfnormal"):
        ln_moment(HalfNormal(1.0), np.array(1.0), 1.0)


def product_of_parameters() -> Analysis:
    return Analysis(
        "Two factors",
        regions=(one_bin("on", 3),),
        parameters=(Parameter("a", Uniform(0.0, 1.0)), Parameter("b", Exponential(1.0))),
        processes=(
            Process("background", "background", {"on": Contribution(Flat(), 2.0)}),
            Process("signal", "signal", {"on": Contribution(Flat(), 2.0)}, factors=("a", "b")),
        ),
    )


@pytest.mark.parametrize(
    "analysis",
    [
        counting(3, 2.0, HalfNormal(1.0)),
        counting(3, 2.0, Exponential(1.0), uncertainties=(source("size", background=0.1),)),
        product_of_parameters(),
        templates(
            several_bins(
                "r", [1.0, 2.0], {"b": [1, 1], "signal": [1, 2]}, {"b": [0.2, 0.3]}, template_errors=True
            )
        ),
    ],
    ids=["half-normal", "a source", "a product", "template errors"],
)
def test_what_is_not_linear_in_independent_rates_has_no_closed_form(analysis: Analysis) -> None:
    assert linear_rates(compile_model(analysis, "signal plus background")) is None
    assert weigh(analysis).evidences[1].estimates[0].name != "closed form"


def test_too_many_splits_are_left_to_the_integrators() -> None:
    """20 bins of 30 counts can be split in 31^20 ways."""
    region = several_bins("r", [30.0] * 20, {"b": [20.0] * 20, "signal": [5.0] * 20})
    model = compile_model(templates(region), "signal plus background")
    rates = linear_rates(model)
    assert rates is not None
    assert model.observed is not None
    assert ln_evidence(rates, model.observed) is None


def test_counts_where_nothing_is_expected_have_no_probability() -> None:
    rates = LinearRates(np.array([0.0, 1.0]), np.array([[0.0, 1.0]]), (Exponential(1.0),))
    assert ln_evidence(rates, np.array([1.0, 1.0])) == float("-inf")
    assert ln_evidence(rates, np.array([0.0, 0.0])) == pytest.approx(-1.0 - np.log(2.0), abs=1e-12)


def test_another_prior_is_noticed() -> None:
    """The negative control: the exact sum under a rate a hundredth higher is another number."""
    found = weigh(counting(9, 3.0, Gamma(shape=2.5, rate=2.0))).evidences[1].ln_evidence
    other = weigh(counting(9, 3.0, Gamma(shape=2.5, rate=2.02))).evidences[1].ln_evidence
    assert found is not None
    assert other is not None
    assert abs(found - other) > 1e-4
