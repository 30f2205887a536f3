"""The whole examination: its parts agree with one another and with what `weigh` says."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from scipy import integrate, stats

from tests.evidence.small_analyses import YIELD, counting, one_bin
from workbench.errors import InputError
from workbench.evidence.prior_choice import sensitivity as module
from workbench.evidence.prior_choice.averages import Average
from workbench.evidence.prior_choice.sensitivity import STEPS, prior_sensitivity
from workbench.evidence.weigh import weigh
from workbench.hypotheses.analysis import Analysis, Parameter
from workbench.hypotheses.file.reading import read_analysis
from workbench.hypotheses.hypothesis import Hypothesis
from workbench.hypotheses.priors import Exponential, Fixed, Gamma, Uniform
from workbench.hypotheses.processes import Alternative, Contribution, Process
from workbench.hypotheses.shapes import Flat

DATA = Path(__file__).parents[3] / "data"
BOTH = "signal plus background"


def two_signals() -> Analysis:
    into = {"on": Contribution(Flat(), 4.0)}
    return Analysis(
        "Two signals",
        regions=(one_bin("on", 12),),
        parameters=(Parameter("first", Exponential(1.0)), Parameter("second", Uniform(0.0, 3.0))),
        processes=(
            Process("background", "background", into),
            Process("one", "signal", into, factors=("first",)),
            Process("two", "signal", into, factors=("second",)),
        ),
    )


def test_ln_b_is_that_of_weighing_and_the_curve_agrees() -> None:
    analysis = read_analysis(DATA / "skerry" / "skerry-fixed-mass.toml")
    found = prior_sensitivity(analysis)
    (comparison,) = weigh(analysis).comparisons
    assert found.established
    assert found.comparison == replace(comparison, sensitivity=())
    by_curve = found.declared.by_curve
    assert by_curve.ln_bayes_factor is not None
    assert by_curve.error is not None
    gap = abs(by_curve.ln_bayes_factor - (comparison.ln_bayes_factor or 0.0))
    assert gap < 4.0 * np.hypot(by_curve.error, comparison.ln_bayes_factor_error or 0.0)
    # Twice the uniform range costs ln 2 here; the second estimator of weigh says the same.
    uniform = next(one for one in found.families if one.name == "uniform")
    double = uniform.averages[int(np.argmin(np.abs(found.means - 5.0)))].ln_bayes_factor
    assert double == pytest.approx(comparison.sensitivity[0].doubled, abs=0.02)


def test_every_number_stays_below_the_bound_over_any_prior() -> None:
    found = prior_sensitivity(counting(11, 3.8, Exponential(1.0)))
    any_prior = found.bounds[0]
    assert any_prior.ln_bayes_factor == pytest.approx(11.0 * np.log(11.0 / 3.8) - 7.2, abs=1e-4)
    averages = [
        one for family in found.families for one in family.averages if one.ln_bayes_factor is not None
    ]
    assert len(averages) > 200
    assert (
        max(one.ln_bayes_factor for one in averages if one.ln_bayes_factor)
        <= any_prior.ln_bayes_factor + 1e-6
    )
    assert [bound.name for bound in found.bounds] == [
        "any prior",
        "peak at the prediction",
        "never rising",
        "p-value",
    ]
    assert found.needed[0].probability > found.needed[1].probability
    assert found.events == pytest.approx(YIELD)


def test_means_go_from_the_declared_one_in_equal_steps_and_reach_beyond_what_matters() -> None:
    found = prior_sensitivity(counting(105, 3.0, Uniform(0.0, 0.5)))
    steps = np.log2(found.means / found.declared.mean) * STEPS
    assert steps == pytest.approx(np.round(steps), abs=1e-9)
    assert found.means[0] < 0.25 / 7.9
    assert found.means[-1] > 8.0 * 16.9


def test_crossings_lie_where_direct_integration_puts_the_boundary() -> None:
    """Independent route: scipy's quad at the mean that was found gives ln B at the boundary."""
    found = prior_sensitivity(counting(9, 3.8, Exponential(1.0)))
    crossings = [c for c in found.crossings["Kass and Raftery"] if c.family == "exponential"]
    assert {(c.boundary, c.is_rising) for c in crossings} >= {(1.0, True), (1.0, False)}
    for crossing in crossings:

        def integrand(s: float, mean: float = crossing.mean) -> float:
            return float(stats.poisson.pmf(9, 3.8 + YIELD * s) * stats.expon.pdf(s, scale=mean))

        parts = ((0, 0.5), (0.5, 1.5), (1.5, 4), (4, 12))
        evidence = sum(integrate.quad(integrand, a, b)[0] for a, b in parts)
        value = np.log(evidence / stats.poisson.pmf(9, 3.8))
        assert value == pytest.approx(crossing.boundary, abs=3e-3)


def test_the_first_strength_is_taken_and_another_can_be_asked_for() -> None:
    first, second = prior_sensitivity(two_signals()), prior_sensitivity(two_signals(), parameter="second")
    assert (first.strength, second.strength) == ("first", "second")
    assert first.comparison.ln_bayes_factor == second.comparison.ln_bayes_factor
    assert "other-strengths" in {caution.code for caution in first.cautions}
    held = replace(
        two_signals(),
        hypotheses=(Hypothesis("none", ("background",)), Hypothesis("one", ("background", "one"))),
    )
    assert prior_sensitivity(held).cautions == ()


def test_a_hypothesis_or_strength_that_is_not_there_is_refused_with_what_is() -> None:
    with pytest.raises(InputError) as error:
        prior_sensitivity(two_signals(), hypothesis="signal plus backgrond")
    assert 'write "signal plus background"' in str(error.value)
    with pytest.raises(InputError) as error:
        prior_sensitivity(two_signals(), parameter="third")
    assert '"first", "second"' in str(error.value)
    held = counting(9, 3.8, Fixed(1.0))
    with pytest.raises(InputError) as error:
        prior_sensitivity(held)
    assert "No strength whose prior could be examined" in str(error.value)


def test_what_is_not_established_gives_no_numbers_but_the_reason() -> None:
    impossible = replace(
        counting(3, 2.0, Exponential(1.0)),
        processes=(
            Process("background", "background", {"on": Contribution(Flat(), 0.0)}),
            Process("signal", "signal", {"on": Contribution(Flat(), 4.0)}, factors=("strength",)),
        ),
    )
    found = prior_sensitivity(impossible)
    assert not found.established
    assert "background only" in found.reason
    assert (found.curve, found.families, found.bounds, found.needed) == (None, (), (), ())


def test_a_curve_that_disagrees_with_the_weighed_ln_b_is_not_established(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    monkeypatch.setattr(module, "average", lambda curve, prior: Average(5.0, 0.001))
    found = prior_sensitivity(counting(9, 3.8, Exponential(1.0)))
    assert not found.established
    assert "differ by" in found.reason


def test_a_strength_that_the_counts_do_not_bound_is_told() -> None:
    """A signal that adds a millionth of an event: R stays at 1."""
    analysis = counting(9, 3.8, Gamma(2.0, 2.0))
    tiny = replace(
        analysis,
        processes=(
            analysis.processes[0],
            Process("signal", "signal", {"on": Contribution(Flat(), 1e-12)}, factors=("strength",)),
        ),
    )
    found = prior_sensitivity(tiny)
    assert "unbounded-strength" in {caution.code for caution in found.cautions}
    assert found.bounds[0].ln_bayes_factor == pytest.approx(0.0, abs=1e-3)
    values = [one.ln_bayes_factor for family in found.families for one in family.averages]
    assert values == pytest.approx([0.0] * len(values), abs=1e-3)


def test_the_same_seed_gives_the_same_numbers() -> None:
    analysis = read_analysis(DATA / "sorrel" / "sorrel.toml")
    first, again = prior_sensitivity(analysis, seed=7), prior_sensitivity(analysis, seed=7)
    assert first.bounds == again.bounds
    assert first.scalings == again.scalings
    assert first.families == again.families


def doubtful(observed: float) -> Analysis:
    """Return a count whose known background is 3.8 with probability 2/3, or 6.5."""
    into = {"on": Contribution(Flat(), YIELD)}
    levels = tuple(
        Alternative(name, {"on": Contribution(Flat(), level)}, prior)
        for name, level, prior in (("low", 3.8, 2.0), ("high", 6.5, 1.0))
    )
    return Analysis(
        "In doubt",
        regions=(one_bin("on", observed),),
        parameters=(Parameter("strength", Exponential(1.0)),),
        processes=(
            Process("background", "background", {}, alternatives=levels),
            Process("signal", "signal", into, factors=("strength",)),
        ),
    )


def test_alternatives_of_a_background_are_averaged_at_every_strength() -> None:
    """By hand: R = sum of P(k) Poisson(n | b_k + s y) over sum of P(k) Poisson(n | b_k)."""
    found = prior_sensitivity(doubtful(11))
    assert found.established
    curve = found.curve
    assert curve is not None

    def averaged(s: float) -> float:
        return float(sum(p * stats.poisson.pmf(11, b + YIELD * s) for p, b in ((2 / 3, 3.8), (1 / 3, 6.5))))

    for s in (0.0, 0.4, 1.3, 2.4):
        expected = np.log(averaged(s) / averaged(0.0))
        assert float(curve.at(np.array(s))) == pytest.approx(expected, abs=5e-3)
    assert "one-alternative" in {caution.code for caution in found.cautions}
