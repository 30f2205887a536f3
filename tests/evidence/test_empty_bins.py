"""Counts where nothing is expected: never a discovery, and what a stand-in for the empty simulation does."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy import stats

from tests.evidence.small_analyses import several_bins, source, templates
from workbench.evidence.results import Comparison, Evidence
from workbench.evidence.weigh import weigh
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.priors import Uniform
from workbench.likelihood.model import compile_model

SIGNAL = "signal plus background"


def value(evidence: Evidence) -> tuple[float, float]:
    assert evidence.established, evidence.reason
    assert evidence.ln_evidence is not None
    assert evidence.error is not None
    return evidence.ln_evidence, evidence.error


def ln_b(comparison: Comparison) -> float:
    assert comparison.ln_bayes_factor is not None
    return comparison.ln_bayes_factor


def numbers_in(text: str) -> list[float]:
    words = [word.strip(".,;") for word in text.split()]
    return [float(word.replace("−", "-")) for word in words if "." in word]


TIGHT = Uniform(0.0, 5.0)


def with_empty_bin(count: float, events: float | None, signal: float = 1.0) -> Analysis:
    region = several_bins(
        "r",
        [3.0, 2.0, count],
        {"background": [3.0, 2.0, 0.0], "signal": [1.0, 1.0, signal]},
        empty_bin_events=events,
    )
    return templates(region, TIGHT)


def test_counts_where_nothing_is_expected_are_not_a_discovery() -> None:
    weighing = weigh(with_empty_bin(1.0, None))
    background, signal = weighing.evidences
    assert (background.established, background.ln_evidence, background.error) == (False, None, None)
    assert 'region "r" from 2 to 3' in background.reason
    assert "set empty_bin_events in the region" in background.reason
    assert "save one first with --save" in background.reason  # a histogram alone has no region to set it in
    assert signal.established
    (comparison,) = weighing.comparisons
    assert (comparison.ln_bayes_factor, comparison.posterior_odds, comparison.established) == (
        None,
        None,
        False,
    )
    assert [one.probability for one in weighing.posteriors] == [None, None]
    assert not weighing.established


def test_every_such_bin_is_named() -> None:
    columns = {"background": [0.0, 2.0, 0.0, 0.0], "signal": [1.0, 1.0, 1.0, 1.0]}
    region = several_bins("r", [4.0, 2.0, 0.0, 1.0], columns)
    reason = weigh(templates(region)).evidences[0].reason
    assert "from 0 to 1" in reason
    assert "from 3 to 4" in reason
    assert "from 2 to 3" not in reason, "an empty bin without counts is no difficulty"


@pytest.mark.parametrize("events", [0.01, 0.1, 1.0])
def test_events_for_empty_bins_make_it_established(events: float) -> None:
    """By hand: gamma with mean x and variance x^2 is an exponential: P(n) = x^n/(1 + x)^(n + 1)."""
    weighing = weigh(with_empty_bin(2.0, events))
    exact = stats.poisson.logpmf(3, 3.0) + stats.poisson.logpmf(2, 2.0)
    exact += 2.0 * np.log(events) - 3.0 * np.log1p(events)
    found, error = value(weighing.evidences[0])
    assert found == pytest.approx(exact, abs=1e-10)
    assert error == 0.0
    assert weighing.established
    assert weighing.comparisons[0].posterior_odds is not None


def test_the_bayes_factor_is_shown_for_a_tenth_once_and_ten_times_the_events() -> None:
    (caution,) = [one for one in weigh(with_empty_bin(1.0, 0.1)).cautions if one.code == "empty-bin-events"]
    direct = [ln_b(weigh(with_empty_bin(1.0, events)).comparisons[0]) for events in (0.01, 0.1, 1.0)]
    assert numbers_in(caution.text) == pytest.approx(direct, abs=0.03)
    assert SIGNAL in caution.text
    assert abs(direct[0] - direct[1]) > 1.0, "the negative control: the three do differ"


def test_the_bayes_factor_with_sources_follows_the_events_too() -> None:
    def declared(events: float) -> Analysis:
        return replace(with_empty_bin(1.0, events), uncertainties=(source("size", background=0.2),))

    (caution,) = [one for one in weigh(declared(0.1)).cautions if one.code == "empty-bin-events"]
    direct = [ln_b(weigh(declared(events)).comparisons[0]) for events in (0.01, 0.1, 1.0)]
    assert numbers_in(caution.text) == pytest.approx(direct, abs=0.03)


def test_events_for_empty_bins_that_no_bin_needs_are_not_mentioned() -> None:
    region = several_bins(
        "r", [3.0, 2.0], {"background": [3.0, 2.0], "signal": [1.0, 1.0]}, empty_bin_events=0.1
    )
    assert weigh(templates(region)).cautions == ()


def test_a_bin_that_only_signal_fills_gets_its_events_under_every_hypothesis() -> None:
    """By hand: at strength s the bin holds T = x + s, V = x^2, so that A = T^2/V and p = A/(A + T).

    Once only background-only got the events, so that a signal of strength 0 was not background only.
    """
    events, count = 0.1, 2.0
    analysis = with_empty_bin(count, events)
    background, signal = (compile_model(analysis, one.name) for one in analysis.hypotheses)
    counts = np.array([3.0, 2.0, count])
    alone = background.ln_likelihood(background.natural_seeds(np.zeros((1, 0))), counts)[0]
    found = signal.ln_likelihood(signal.natural_seeds(np.array([[0.0], [1.5]])), counts)
    assert found[0] == alone
    total = events + 1.5
    shape = (total / events) ** 2
    exact = stats.poisson.logpmf([3, 2], [4.5, 3.5]).sum()
    exact += stats.nbinom.logpmf(count, shape, shape / (shape + total))
    assert found[1] == pytest.approx(exact, abs=1e-10)
