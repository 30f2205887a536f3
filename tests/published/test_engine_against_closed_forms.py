"""The engine on counting analyses whose evidences are known exactly: its closed and its numerical path."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import pytest
from scipy import stats

from workbench.counts.binning import Binning
from workbench.counts.region import Region
from workbench.counts.table import Table
from workbench.evidence.formulas import closed_forms, count_mixtures
from workbench.evidence.weigh import weigh, weigh_hypothesis
from workbench.hypotheses.analysis import Analysis, Parameter
from workbench.hypotheses.priors import Exponential, Gamma, Prior, Uniform
from workbench.hypotheses.processes import Contribution, Process
from workbench.hypotheses.shapes import Flat
from workbench.likelihood.model import compile_model

YIELD = 6.0  # events at strength 1
TAU = 4.0
RATES = Gamma(shape=1.5, rate=0.1)


def one_bin(name: str, observed: int) -> Region:
    return Region(name, Table(Binning(np.array([0.0]), np.array([1.0])), np.array([float(observed)])))


def counting(
    observed: int, background: float | Prior, strength: Prior, control: int | None = None
) -> Analysis:
    """Declare one count, its background known or with a prior, a signal, and perhaps a control region."""
    parameters = [Parameter("strength", strength)]
    known = isinstance(background, float)
    if not isinstance(background, float):
        parameters.append(Parameter("level", background))
    into = {"on": Contribution(Flat(), background if isinstance(background, float) else 1.0)}
    regions = [one_bin("on", observed)]
    if control is not None:
        regions.append(one_bin("off", control))
        into["off"] = Contribution(Flat(), TAU)
    return Analysis(
        title="Counting",
        regions=tuple(regions),
        parameters=tuple(parameters),
        processes=(
            Process("background", "background", into, factors=() if known else ("level",)),
            Process("signal", "signal", {"on": Contribution(Flat(), YIELD)}, factors=("strength",)),
        ),
    )


@dataclass(frozen=True)
class Case:
    """An analysis with the exact ln evidences of background only and of signal plus background."""

    name: str
    analysis: Callable[[], Analysis]
    exact: Callable[[], tuple[float, float]]


def known_background(n: int, b: float, mean: float) -> Case:
    return Case(
        f"{n} on {b:g} known, exponential strength",
        lambda: counting(n, b, Exponential(mean)),
        lambda: (
            float(stats.poisson.logpmf(n, b)),
            closed_forms.ln_known_background_exponential(n, b, mean * YIELD),
        ),
    )


def known_background_gamma(n: int, b: float) -> Case:
    return Case(
        f"{n} on {b:g} known, gamma strength",
        lambda: counting(n, b, Gamma(shape=2.5, rate=2.0)),
        lambda: (float(stats.poisson.logpmf(n, b)), closed_forms.ln_known_background(n, b, 2.5, 2.0 / YIELD)),
    )


def known_background_uniform(n: int, b: float) -> Case:
    return Case(
        f"{n} on {b:g} known, uniform strength",
        lambda: counting(n, b, Uniform(0.0, 5.0)),
        lambda: (
            float(stats.poisson.logpmf(n, b)),
            closed_forms.ln_known_background_uniform(n, b, 0.0, 5.0 * YIELD),
        ),
    )


def gamma_background(n: int) -> Case:
    level = Gamma(shape=40.0, rate=10.0)
    return Case(
        f"{n} on a gamma background",
        lambda: counting(n, level, Exponential(1.0)),
        lambda: (
            float(count_mixtures.ln_gamma_mixture(n, level.shape, level.rate)),
            closed_forms.ln_gamma_background(n, (level.shape, level.rate), (1.0, 1.0 / YIELD)),
        ),
    )


def on_off(n_on: int, n_off: int) -> Case:
    prior = (RATES.shape, RATES.rate)
    return Case(
        f"{n_on} on, {n_off} off",
        lambda: counting(n_on, RATES, Exponential(1.0), control=n_off),
        lambda: (
            closed_forms.ln_on_off_background(n_on, n_off, TAU, prior),
            closed_forms.ln_on_off_signal(n_on, n_off, TAU, prior, (1.0, 1.0 / YIELD)),
        ),
    )


CASES = [
    known_background(0, 3.0, 1.0),
    known_background(5, 10.0, 1.0),
    known_background(17, 3.8, 2.0),
    known_background(900, 1000.0, 5.0),
    known_background_gamma(9, 3.0),
    known_background_uniform(9, 3.0),
    known_background_uniform(1, 6.0),
    gamma_background(0),
    gamma_background(17),
    on_off(0, 0),
    on_off(0, 14),
    on_off(8, 14),
    on_off(30, 40),
    on_off(2, 400),
]
every_case = pytest.mark.parametrize("case", CASES, ids=lambda case: case.name)


@every_case
def test_the_closed_path_gives_the_exact_evidence(case: Case) -> None:
    for evidence, exact in zip(weigh(case.analysis()).evidences, case.exact(), strict=True):
        assert [estimate.name for estimate in evidence.estimates] == ["closed form"]
        assert evidence.established
        assert evidence.ln_evidence == pytest.approx(exact, abs=1e-9)


def numerical(analysis: Analysis, index: int, seed: int) -> tuple[float, float]:
    """Return ln evidence and error of one hypothesis without closed forms; it has to be established."""
    model = compile_model(analysis, analysis.hypotheses[index].name)
    evidence = weigh_hypothesis(model, np.random.SeedSequence(seed), closed_forms=False).evidence
    assert evidence.established, evidence
    assert evidence.ln_evidence is not None
    assert evidence.error is not None
    return evidence.ln_evidence, evidence.error


def something_to_integrate(case: Case) -> list[int]:
    """Return the hypotheses with free parameters: a known background alone has none."""
    analysis = case.analysis()
    return [i for i, one in enumerate(analysis.hypotheses) if compile_model(analysis, one.name).size]


@every_case
def test_the_numerical_path_gives_the_exact_evidence_within_its_own_error(case: Case) -> None:
    for index in something_to_integrate(case):
        found, error = numerical(case.analysis(), index, seed=3)
        assert error < 0.01
        # The error comes from the spread of 16 scrambles: 5 of them are passed once in ten thousand times.
        assert abs(found - case.exact()[index]) < 5.0 * error + 1e-7


def test_the_numerical_path_would_notice_another_prior() -> None:
    """The negative control: the same counts with the strength's prior a tenth wider are many errors away."""
    found, error = numerical(on_off(8, 14).analysis(), 1, seed=3)
    other = closed_forms.ln_on_off_signal(8, 14, TAU, (RATES.shape, RATES.rate), (1.0, 1.0 / (1.1 * YIELD)))
    assert abs(found - other) > 8.0 * error


def test_errors_of_the_numerical_path_are_of_the_right_size() -> None:
    """Pulls over several cases and seeds: their mean square is 1, less where the error stands at its floor.

    In one or two dimensions the lattices are far better than independent draws, and the error is kept at 0.3
    of what those would have: on purpose too large there, never too small.
    """
    pulls = []
    for case in (known_background(17, 3.8, 2.0), gamma_background(17), on_off(8, 14), on_off(30, 40)):
        for seed in range(10):
            found, error = numerical(case.analysis(), 1, seed)
            pulls.append((found - case.exact()[1]) / error)
    # 40 pulls of a t-like law with 15 degrees of freedom: mean square 15/13, sd about 0.3.
    assert 0.05 < float(np.mean(np.square(pulls))) < 2.4


def test_no_counts_have_their_ceiling_whatever_the_engine_does() -> None:
    """By hand: B01 = 1 + S for an exponential prior of mean S."""
    analysis = counting(0, 3.0, Exponential(1.0))
    ln_b = weigh(analysis).comparisons[0].ln_bayes_factor
    assert ln_b is not None
    assert np.exp(-ln_b) == pytest.approx(1.0 + YIELD, rel=1e-12)
    found, _ = numerical(analysis, 1, seed=1)
    assert np.exp(-3.0 - found) == pytest.approx(1.0 + YIELD, rel=0.01)
