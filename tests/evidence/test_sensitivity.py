"""How ln B answers another width of the strength's prior: as if that prior had been declared."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import numpy.typing as npt
import pytest
from scipy import special

from tests.evidence.small_analyses import bump, counting, one_bin, source
from workbench.evidence.results import ScaledPrior
from workbench.evidence.weigh import weigh
from workbench.hypotheses.analysis import Analysis, Parameter
from workbench.hypotheses.priors import Beta, Exponential, Gamma, HalfNormal, LogNormal, Prior, Uniform
from workbench.hypotheses.processes import Contribution, Process
from workbench.hypotheses.shapes import Flat

Array = npt.NDArray[np.float64]

# The scaled priors, written out by hand.
SCALED: list[tuple[Prior, Prior, Prior]] = [
    (Uniform(0.0, 5.0), Uniform(0.0, 2.5), Uniform(0.0, 10.0)),
    (Uniform(1.0, 5.0), Uniform(1.0, 3.0), Uniform(1.0, 9.0)),
    (Exponential(1.0), Exponential(0.5), Exponential(2.0)),
    (HalfNormal(2.0), HalfNormal(1.0), HalfNormal(4.0)),
    (LogNormal(0.8, 4.0), LogNormal(0.8, 2.0), LogNormal(0.8, 16.0)),
    (Gamma(4.0, 2.0), Gamma(16.0, 8.0), Gamma(1.0, 0.5)),
]


def with_strength(analysis: Analysis, prior: Prior) -> Analysis:
    return replace(
        analysis,
        parameters=tuple(replace(p, prior=prior) if p.name == "strength" else p for p in analysis.parameters),
    )


def weighed(analysis: Analysis, *, closed_forms: bool) -> tuple[float, float, ScaledPrior]:
    (comparison,) = weigh(analysis, closed_forms=closed_forms).comparisons
    (scaled,) = comparison.sensitivity
    assert comparison.ln_bayes_factor is not None
    assert comparison.ln_bayes_factor_error is not None
    return comparison.ln_bayes_factor, comparison.ln_bayes_factor_error, scaled


@pytest.mark.parametrize("closed_forms", [True, False], ids=["closed", "numerical"])
@pytest.mark.parametrize(("prior", "half", "twice"), SCALED, ids=lambda prior: prior.text())
def test_a_scaled_prior_is_that_prior_declared(
    prior: Prior, half: Prior, twice: Prior, closed_forms: bool
) -> None:
    analysis = counting(14, 6.0, prior)
    _, error, scaled = weighed(analysis, closed_forms=closed_forms)
    assert scaled.parameter == "strength"
    assert scaled.prior == prior.text()
    for found, other in ((scaled.halved, half), (scaled.doubled, twice)):
        expected, own_error, _ = weighed(with_strength(analysis, other), closed_forms=closed_forms)
        assert found == pytest.approx(expected, abs=1e-9 + 4.0 * np.hypot(error, own_error))
    # The negative control: the two widths do differ by far more than that.
    assert scaled.halved is not None
    assert scaled.doubled is not None
    assert abs(scaled.halved - scaled.doubled) > 20.0 * error


def test_a_mass_and_sources_take_part_in_the_recomputation() -> None:
    edges = np.linspace(0.0, 20.0, 41)
    continuum = 400.0 * -np.diff(np.exp(-edges / 8.0)) / -np.expm1(-20.0 / 8.0)
    peak = 25.0 * np.diff(special.ndtr((edges - 9.0) / 0.4))
    analysis = bump(np.round(continuum + peak), uncertainties=(source("size", continuum=0.05, peak=0.1),))
    _, error, scaled = weighed(analysis, closed_forms=False)
    for found, prior in ((scaled.halved, Uniform(0.0, 2.5)), (scaled.doubled, Uniform(0.0, 10.0))):
        expected, own_error, _ = weighed(with_strength(analysis, prior), closed_forms=False)
        assert found == pytest.approx(expected, abs=4.0 * np.hypot(error, own_error) + 1e-3)


def test_a_wide_uniform_prior_costs_ln_two_for_each_doubling() -> None:
    """By hand: where the likelihood has ended well inside the range, twice the range is half the evidence."""
    value, _, scaled = weighed(counting(14, 6.0, Uniform(0.0, 40.0)), closed_forms=True)
    assert scaled.halved == pytest.approx(value + np.log(2.0), abs=1e-6)
    assert scaled.doubled == pytest.approx(value - np.log(2.0), abs=1e-6)


def test_a_family_without_a_width_says_so() -> None:
    _, _, scaled = weighed(counting(14, 6.0, Beta(2.0, 3.0)), closed_forms=True)
    assert (scaled.halved, scaled.doubled) == (None, None)


def test_each_strength_is_scaled_by_itself() -> None:
    into = {"on": Contribution(Flat(), 4.0)}
    analysis = Analysis(
        "Two signals",
        regions=(one_bin("on", 12),),
        parameters=(Parameter("first", Exponential(1.0)), Parameter("second", Uniform(0.0, 3.0))),
        processes=(
            Process("background", "background", into),
            Process("one", "signal", into, factors=("first",)),
            Process("two", "signal", into, factors=("second",)),
        ),
    )
    first, second = weigh(analysis).comparisons[0].sensitivity
    assert (first.parameter, second.parameter) == ("first", "second")
    narrower = replace(analysis, parameters=(analysis.parameters[0], Parameter("second", Uniform(0.0, 1.5))))
    assert second.halved == pytest.approx(weigh(narrower).comparisons[0].ln_bayes_factor, abs=1e-9)


def test_nothing_is_scaled_where_there_is_no_bayes_factor() -> None:
    impossible = replace(
        counting(3, 2.0, Exponential(1.0)),
        processes=(
            Process("background", "background", {"on": Contribution(Flat(), 0.0)}),
            Process("signal", "signal", {"on": Contribution(Flat(), 4.0)}, factors=("strength",)),
        ),
    )
    (comparison,) = weigh(impossible).comparisons
    assert comparison.ln_bayes_factor is None
    assert comparison.sensitivity == ()
