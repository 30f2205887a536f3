"""Priors at their limits: deep tails, extreme numbers, and numbers that make no prior."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
from scipy import stats

from workbench.errors import InputError
from workbench.hypotheses.priors import (
    Beta,
    ContinuousPrior,
    Exponential,
    Fixed,
    Gamma,
    HalfNormal,
    LogNormal,
    LogUniform,
    Normal,
    Uniform,
)

EXTREMES: list[ContinuousPrior] = [
    Normal(0.0, 1.0, -1e6, 1e6),
    Normal(0.0, 1.0, 38.0, 39.0),
    Normal(0.0, 1e-3, 1.0),
    Gamma(0.01, 1.0),
    Gamma(1e6, 1.0),
    Beta(0.01, 0.01),
    Beta(1e5, 2.0),
    Beta(0.1, 30.0),
    LogNormal(1.0, 1e3),
    LogUniform(1e-100, 1e100),
]


def test_a_deep_tail_worked_by_hand() -> None:
    """Phi(-30) = 4.906713927148187e-198 (mpmath's ncdf, from memory); Phi(t) is x for the unit uniform."""
    tail = 4.906713927148187e-198
    np.testing.assert_allclose(Uniform(0.0, 1.0).from_standard(-30.0).value, tail, rtol=1e-12)
    np.testing.assert_allclose(Exponential(1.0).from_standard(-30.0).value, tail, rtol=1e-12)
    np.testing.assert_allclose(Exponential(1.0).from_standard(30.0).value, -np.log(tail), rtol=1e-14)
    np.testing.assert_allclose(
        HalfNormal(1.0).from_standard(-30.0).value, tail * np.sqrt(np.pi / 2), rtol=1e-12
    )
    np.testing.assert_allclose(Gamma(1.0, 1.0).from_standard(30.0).value, -np.log(tail), rtol=1e-12)


def test_a_normal_cut_far_out_keeps_its_tail() -> None:
    """Above 20 sd: Q(u) = Q(20) Q(t), with scipy.stats.norm.logsf for Q."""
    u = Normal(0.0, 1.0, low=20.0).from_standard(np.array([-3.0, 0.0, 3.0, 30.0])).value
    expected = stats.norm.logsf(20.0) + stats.norm.logsf([-3.0, 0.0, 3.0, 30.0])
    np.testing.assert_allclose(stats.norm.logsf(u), expected, rtol=1e-13)


@pytest.mark.parametrize("prior", EXTREMES, ids=[prior.text() for prior in EXTREMES])
def test_extreme_priors_make_no_nan_and_no_warning(prior: ContinuousPrior) -> None:
    x = prior.from_standard(np.linspace(-38.0, 38.0, 305))
    assert all(np.isfinite(part).all() for part in x)
    assert (np.diff(x.value) >= 0.0).all()
    assert not np.isnan(prior.ln_density(x.value)).any()
    assert not np.isnan(prior.to_standard(x.value)).any()
    assert np.isfinite(prior.fit_penalty(x.value[100:200]).first).all()


@pytest.mark.parametrize(
    "make",
    [
        lambda: Uniform(1.0, 1.0),
        lambda: Uniform(0.0, 1e101),
        lambda: Fixed(-1e-101),
        lambda: Gamma(1e-300, 1.0),
        lambda: LogNormal(1.0, 1e7),
        lambda: Uniform(0.0, np.inf),
        lambda: Normal(0.0, 0.0),
        lambda: Normal(0.0, 1.0, low=2.0, high=1.0),
        lambda: LogNormal(3.0, 1.0),
        lambda: LogNormal(0.0, 2.0),
        lambda: Gamma(0.0, 1.0),
        lambda: Gamma(1.0, np.nan),
        lambda: Exponential(-1.0),
        lambda: HalfNormal(0.0),
        lambda: LogUniform(0.0, 1.0),
        lambda: Beta(1.0, 0.0),
        lambda: Fixed(np.inf),
    ],
)
def test_what_is_no_proper_prior_is_refused(make: Callable[[], object]) -> None:
    with pytest.raises(InputError):
        make()


def test_every_fault_is_told_at_once() -> None:
    with pytest.raises(InputError) as caught:
        Beta(0.0, -1.0, 2.0, 1.0)
    assert len(caught.value.problems) == 3


def test_a_number_left_out_is_not_made_up() -> None:
    """Fields named like a property of every prior once took it for their default."""
    for family in (Exponential, HalfNormal, LogNormal, Normal):
        with pytest.raises(TypeError):
            family()  # type: ignore[call-arg]
