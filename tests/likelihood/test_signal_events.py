"""What priors mean in events, against scipy's distributions and brute-force quadrature."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from scipy import stats

import workbench as wb
from tests.analyses import BOTH, bump_hunt, counting, everything
from workbench.hypotheses.priors import Prior
from workbench.likelihood.signal_events import SignalEvents, signal_events, signal_events_along

SHARES = [0.025, 0.16, 0.5, 0.84, 0.975]


def quantiles(found: SignalEvents) -> list[float]:
    (low_68, high_68), (low_95, high_95) = found.central_68, found.central_95
    return [low_95, low_68, found.median, high_68, high_95]


@pytest.mark.parametrize(
    ("prior", "law"),
    [
        (wb.Uniform(0.0, 5.0), stats.uniform(0.0, 5.0)),
        (wb.HalfNormal(2.0), stats.halfnorm(scale=2.0)),
        (wb.Exponential(1.5), stats.expon(scale=1.5)),
        (wb.Gamma(2.0, 0.8), stats.gamma(2.0, scale=1.25)),
        (wb.LogNormal(1.0, 2.0), stats.lognorm(np.log(2.0))),
    ],
    ids=lambda one: getattr(one, "family", ""),
)
def test_a_strength_alone_is_its_prior_times_the_prediction(prior: Prior, law: stats.rv_continuous) -> None:
    """scipy.stats gives the quantiles; the errors stated must cover what is off."""
    found = signal_events(counting(3.0, 2.0, 30.0, prior), BOTH)
    truth = 30.0 * law.ppf(SHARES)
    assert quantiles(found) == pytest.approx(truth, rel=1e-2)
    off = np.abs(np.array(quantiles(found)) - truth)
    assert np.all(off <= np.array(found.errors))
    assert np.all(np.array(found.errors) <= 0.03 * truth)


def test_two_strengths_multiply() -> None:
    """A product of log-normals is one: ln sd adds in quadrature (textbook)."""
    plain = counting(3.0, 2.0, 10.0, wb.LogNormal(2.0, 1.5))
    more = replace(plain.process("sought"), factors=("strength", "other"))
    analysis = replace(
        plain,
        parameters=(*plain.parameters, wb.Parameter("other", wb.LogNormal(0.5, 1.8))),
        processes=(plain.process("known"), more),
    )
    law = stats.lognorm(np.hypot(np.log(1.5), np.log(1.8)), scale=10.0)
    assert quantiles(signal_events(analysis, BOTH)) == pytest.approx(law.ppf(SHARES), rel=1e-2)


def test_what_falls_outside_the_bins_is_lost() -> None:
    """Brute force over a fine grid of strength and mass, with scipy's normal distribution for the peak."""
    plain = bump_hunt()
    wide = wb.Parameter("mass", wb.Uniform(10.0, 90.0))
    analysis = replace(plain, parameters=(plain.parameters[0], wide, plain.parameters[2]))
    strength = np.linspace(0.0, 10.0, 2001)[:-1] + 0.0025
    mass = np.linspace(10.0, 90.0, 2001)[:-1] + 0.02
    kept = stats.norm.cdf((80.0 - mass) / 1.2) - stats.norm.cdf((20.0 - mass) / 1.2)
    truth = np.quantile(20.0 * strength[:, None] * kept[None, :], SHARES)
    found = signal_events(analysis, BOTH)
    assert quantiles(found) == pytest.approx(truth, rel=2e-2, abs=0.05)
    assert found.central_95[0] < 0.01  # a quarter of the prior puts the peak outside


def test_a_held_signal_expects_one_number() -> None:
    analysis = counting(3.0, 2.0, 30.0, wb.Fixed(1.5))
    assert quantiles(signal_events(analysis, BOTH)) == pytest.approx([45.0] * 5)


def test_without_a_signal_there_are_no_events() -> None:
    found = signal_events(bump_hunt(), "background only")
    assert quantiles(found) == [0.0] * 5
    assert not found.ordered.any()


def test_nuisance_parameters_stay_at_their_medians() -> None:
    """A source on the signal alone changes nothing, however large."""
    plain = counting(3.0, 2.0, 30.0)
    larger = replace(plain, uncertainties=(wb.Uncertainty("size", (wb.Effect("sought", 0.5),)),))
    assert quantiles(signal_events(larger, BOTH)) == quantiles(signal_events(plain, BOTH))


def test_every_signal_shape_and_alternative_backgrounds_have_their_events() -> None:
    for analysis in (
        everything(),
        wb.read_analysis(Path(__file__).parents[1] / "hypotheses" / "files" / "alternatives.toml"),
    ):
        found = signal_events(analysis, analysis.hypotheses[-1].name)
        assert np.all(np.isfinite(found.ordered))
        assert np.all(np.diff(found.ordered) >= 0.0)
        assert found.central_95[0] <= found.central_68[0] <= found.median <= found.central_68[1]


def test_along_a_strength_events_are_in_proportion() -> None:
    found = signal_events_along(bump_hunt(), BOTH, "strength", [0.0, 1.0, 2.5])
    assert found == pytest.approx([0.0, 20.0, 50.0], rel=1e-6)
    outside = signal_events_along(bump_hunt(), BOTH, "mass", [20.0, 50.0])
    assert outside == pytest.approx([50.0, 100.0], rel=1e-6)  # the strength's median is 5
    with pytest.raises(wb.InputError, match="not free"):
        signal_events_along(bump_hunt(), BOTH, "strenght", [1.0])
