"""What is said where a fit has no good answer: limits, flat directions, shapes alike, priors that decide."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import numpy.typing as npt
import pytest
from scipy import optimize

from tests.analyses import (
    BOTH,
    background,
    counting,
    of,
    region_of,
    seen_bump,
    signal,
)
from workbench.errors import InputError
from workbench.hypotheses.analysis import Analysis, Parameter
from workbench.hypotheses.priors import LogNormal, Normal, Prior, Uniform
from workbench.hypotheses.shapes import Flat, Gaussian, Template
from workbench.hypotheses.uncertainties import Effect, Uncertainty
from workbench.likelihood.fit import fit
from workbench.likelihood.results import Ending

Array = npt.NDArray[np.float64]


def test_a_strength_at_its_boundary_has_a_one_sided_error_and_says_so() -> None:
    """N4: n = 1, b = 4, s = 2. The ln likelihood in v is ln v - v; from v = 4 up it falls by 1/2 at 4.598."""
    found = fit(counting(1.0, 4.0, 2.0), BOTH)
    strength = of(found, "strength")
    assert found.ending is Ending.AT_LIMIT
    assert strength.value == 0.0
    assert strength.at_limit
    assert strength.error is None
    assert strength.low is None
    crossing = optimize.brentq(lambda v: math.log(v / 4) - v + 4 + 0.5, 4.0, 8.0)
    assert strength.high == pytest.approx((crossing - 4) / 2, rel=1e-4)
    assert found.notes == ('"strength" is at the end of its range: its error is one-sided',)


def test_without_asymmetric_errors_a_strength_at_its_boundary_has_none() -> None:
    found = fit(counting(1.0, 4.0, 2.0), BOTH, asymmetric=False)
    assert of(found, "strength").high is None
    assert found.notes == ('"strength" is at the end of its range: no error is quoted',)


def test_a_mass_without_a_signal_is_flat_is_named_and_has_no_error() -> None:
    """N5: 8 counts in every bin, where 10 are known to be expected, leave strength 0 and any mass."""
    analysis = Analysis(
        "Deficit",
        (region_of(np.arange(11.0), np.full(10, 8.0)),),
        (Parameter("strength", Uniform(0.0, 10.0)), Parameter("mass", Uniform(1.0, 9.0))),
        (background("b", Flat(), 100.0), signal("s", Gaussian("mass", 0.7), 5.0, "strength")),
    )
    found = fit(analysis, BOTH)
    strength, mass = of(found, "strength"), of(found, "mass")
    assert found.ending is Ending.FLAT
    assert (strength.value, strength.error, strength.low) == (0.0, None, None)
    assert strength.high is not None
    assert (mass.error, mass.low, mass.high) == (None, None, None)
    assert found.notes == (
        'the data do not constrain "mass"; no error is quoted',
        '"strength" is at the end of its range: its error is one-sided',
    )
    assert np.isfinite(found.correlations).all()


def test_only_the_product_of_two_factors_is_known_and_both_are_named() -> None:
    """N5, N6: two uniform factors of one yield; every direction along a b = constant is free."""
    analysis = Analysis(
        "Product",
        (region_of([0.0, 1.0], [40.0]),),
        (Parameter("a", Uniform(0.1, 20.0)), Parameter("b", Uniform(0.1, 20.0))),
        (background("x", Flat(), 1.0, "a", "b"),),
    )
    found = fit(analysis, "background only")
    a, b = of(found, "a"), of(found, "b")
    assert a.value * b.value == pytest.approx(40.0, rel=1e-4)
    assert found.ending is Ending.FLAT
    assert a.error is None
    assert b.error is None
    assert '"a", "b"' in found.notes[0]


def alike(observed: list[float], prior: Prior) -> Analysis:
    """A signal with nearly the shape of a background of free size."""
    columns = {"back": [10.0, 20.0, 30.0], "sig": [10.1, 20.0, 29.9]}
    return Analysis(
        "Alike",
        (region_of([0.0, 1, 2, 3], observed, columns),),
        (Parameter("strength", Uniform(0.0, 50.0)), Parameter("size", prior)),
        (
            background("back", Template("back"), None, "size"),
            signal("sig", Template("sig"), None, "strength"),
        ),
    )


def test_shapes_that_the_data_cannot_tell_apart_are_named() -> None:
    """N6: signal nearly equal to the background."""
    found = fit(alike([31.0, 60.0, 89.0], Uniform(0.0, 50.0)), BOTH)
    assert found.ending in {Ending.CONVERGED, Ending.AT_LIMIT}
    told = fit(alike([101.0, 200.0, 299.0], Normal(5.0, 4.0, low=0.0)), BOTH)
    assert any(note.startswith('the data cannot tell "strength" from "size"') for note in told.notes)
    assert told.correlations[0, 1] < -0.99


def test_shapes_that_are_the_same_are_flat() -> None:
    analysis = alike([100.0, 200.0, 300.0], Uniform(0.0, 50.0))
    analysis = replace(
        analysis,
        processes=(analysis.processes[0], signal("sig", Template("back"), None, "strength")),
    )
    found = fit(analysis, BOTH)
    assert found.ending is Ending.FLAT
    assert of(found, "strength").error is None
    assert of(found, "size").error is None


def test_a_nuisance_that_the_prior_decides_contracts_little_and_is_named() -> None:
    """N14: 100 +- 10 counted, 2 % known beforehand: contraction 1 - 1/(1 + 100 x 0.02^2) = 3.8 %."""
    analysis = Analysis(
        "Prior decides",
        (region_of([0.0, 1.0], [100.0]),),
        (Parameter("rate", Normal(100.0, 2.0, low=0.0)),),
        (background("b", Flat(), "rate"),),
        (Uncertainty("s", (Effect("b", 0.02),)), Uncertainty("idle", (Effect("b", 1e-9),))),
    )
    found = fit(analysis, "background only")
    covariance = np.linalg.inv(np.diag([0.25, 1.0]) + 100.0 * np.outer([0.01, 0.0198], [0.01, 0.0198]))
    rate, source, idle = (of(found, name) for name in ("rate", "s", "idle"))
    assert rate.contraction == pytest.approx(1 - covariance[0, 0] / 4, abs=1e-3)
    assert source.contraction == pytest.approx(1 - covariance[1, 1], abs=1e-3)
    assert idle.contraction == pytest.approx(0.0, abs=1e-9)
    assert rate.contraction is not None
    assert 0.0 < rate.contraction < 0.05
    assert found.notes == ('the data say little about "rate", "s", "idle" (contraction below 0.05)',)


def test_a_lognormal_nuisance_is_measured_in_its_logarithm() -> None:
    """Without information it sits at its median, pulled by nothing, contracted by nothing."""
    analysis = Analysis(
        "Median",
        (region_of([0.0, 1.0], [50.0]),),
        (Parameter("k", LogNormal(1.0, 1.5)), Parameter("rate", Uniform(1.0, 1e4))),
        (background("b", Flat(), "rate", "k"),),
    )
    found = fit(analysis, "background only")
    k, rate = of(found, "k"), of(found, "rate")
    assert k.value == pytest.approx(1.0, abs=1e-4)
    assert k.pull == pytest.approx(0.0, abs=1e-4)
    assert k.contraction == pytest.approx(0.0, abs=1e-4)
    assert rate.pull is None  # a flat prior prefers no value
    assert rate.contraction is not None


def test_counts_that_nothing_can_produce_end_without_support() -> None:
    region = region_of([0.0, 1, 2], [3.0, 1.0], {"t": [2.0, 0.0]})
    found = fit(Analysis("Empty", (region,), (), (background("t", Template("t")),)), "background only")
    assert found.ending is Ending.NO_SUPPORT
    assert found.fitted == ()
    assert found.ln_likelihood == -np.inf


def test_a_fit_without_observed_counts_is_refused() -> None:
    analysis = Analysis("Planning", (region_of([0.0, 1.0]),), (), (background("b", Flat(), 3.0),))
    with pytest.raises(InputError, match="a fit needs observed counts"):
        fit(analysis, "background only")
    with pytest.raises(InputError):
        fit(counting(1.0, 1.0), "no such hypothesis")


def test_a_peak_at_the_end_of_its_range_is_at_its_limit() -> None:
    """The bump stands at 75, the prior of the mass ends at 70."""
    analysis = seen_bump(6.0, 72.0)
    mass, rest = Parameter("mass", Uniform(22.0, 71.0)), analysis.parameters
    found = fit(replace(analysis, parameters=(rest[0], mass, rest[2])), BOTH)
    assert of(found, "mass").value == 71.0
    assert of(found, "mass").high is None
    assert of(found, "mass").low is not None
    assert found.ending is Ending.AT_LIMIT
