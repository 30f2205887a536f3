"""Weighing: what comes back, the nasty cases, and what is refused."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import numpy.typing as npt
import pytest
from scipy import special, stats

from tests.evidence.brute_force import ln_evidence, standard_normal, under
from tests.evidence.small_analyses import TAU, bump, counting, one_bin, several_bins, source, templates
from workbench.counts.table import Table
from workbench.errors import InputError
from workbench.evidence.results import Comparison, Evidence, Weighing
from workbench.evidence.weigh import weigh
from workbench.hypotheses.analysis import Analysis, Hypothesis
from workbench.hypotheses.priors import Exponential, Gamma, LogNormal, Normal, Uniform
from workbench.likelihood.model import compile_model

Array = npt.NDArray[np.float64]

SIGNAL = "signal plus background"


def numbers(weighing: Weighing) -> list[object]:
    """Return every number of a weighing."""
    return [weighing.evidences, weighing.posteriors, weighing.comparisons, weighing.cautions]


def value(evidence: Evidence) -> tuple[float, float]:
    assert evidence.established, evidence.reason
    assert evidence.ln_evidence is not None
    assert evidence.error is not None
    return evidence.ln_evidence, evidence.error


def ln_b(comparison: Comparison) -> float:
    assert comparison.ln_bayes_factor is not None
    return comparison.ln_bayes_factor


def with_sources(counts: list[float], *sizes: float) -> Analysis:
    columns = {"background": [10.0, 15.0, 8.0], "signal": [1.0, 6.0, 2.0]}
    made = tuple(source(f"source {index}", background=size) for index, size in enumerate(sizes))
    return templates(several_bins("r", counts, columns), Exponential(1.0), made)


def test_one_seed_gives_the_same_numbers_bit_for_bit() -> None:
    analysis = bump(np.arange(40.0)[::-1], uncertainties=(source("size", continuum=0.1, peak=0.05),))
    assert numbers(weigh(analysis, seed=7)) == numbers(weigh(analysis, seed=7))


def test_another_seed_gives_other_numbers_within_their_errors() -> None:
    analysis = with_sources([14.0, 22.0, 9.0], 0.3)
    first, second = (value(weigh(analysis, seed=seed).evidences[1]) for seed in (1, 2))
    assert first[0] != second[0]
    assert abs(first[0] - second[0]) < 5.0 * np.hypot(first[1], second[1])


def test_a_hypothesis_more_leaves_the_others_numbers_alone() -> None:
    """Each hypothesis has its own stream of random numbers, in file order."""
    analysis = with_sources([14.0, 22.0, 9.0], 0.3)
    both = analysis.hypotheses
    three = replace(analysis, hypotheses=(*both, replace(both[1], name="fixed", fix={"strength": 1.0})))
    assert weigh(three).evidences[:2] == weigh(analysis).evidences


def test_three_hypotheses_are_compared_with_the_first_in_file_order() -> None:
    """Strength held at 1 and 2: simple hypotheses, whose evidences are Poisson probabilities."""
    analysis = replace(
        counting(9, 4.0, Uniform(0.0, 5.0)),
        hypotheses=(
            Hypothesis("none", ("background",), 3.0),
            Hypothesis("one", ("background", "signal"), 2.0, {"strength": 1.0}),
            Hypothesis("two", ("background", "signal"), 1.0, {"strength": 2.0}),
        ),
    )
    weighing = weigh(analysis)
    exact = stats.poisson.logpmf(9, np.array([4.0, 10.0, 16.0]))
    assert [one.ln_evidence for one in weighing.evidences] == pytest.approx(exact, abs=1e-12)
    assert [(one.hypothesis, one.against) for one in weighing.comparisons] == [
        ("one", "none"),
        ("two", "none"),
    ]
    assert [one.prior_odds for one in weighing.comparisons] == pytest.approx([2.0 / 3.0, 1.0 / 3.0])
    weight = np.array([3.0, 2.0, 1.0]) * np.exp(exact)
    assert [one.probability for one in weighing.posteriors] == pytest.approx(weight / weight.sum(), rel=1e-12)
    assert weighing.established


def test_counts_that_are_not_there_are_asked_for_by_region() -> None:
    planned = replace(
        counting(3, 2.0, Uniform(0.0, 1.0), control=4), regions=(one_bin("on", None), one_bin("off", 4))
    )
    with pytest.raises(InputError, match='region "on"'):
        weigh(planned)


# Very small and very large expectations.


@pytest.mark.parametrize("closed_forms", [True, False])
def test_three_counts_on_a_billionth_of_an_event_are_improbable_and_no_more(closed_forms: bool) -> None:
    """By hand: 3 ln 1e-9 - 1e-9 - ln 6 = -63.9616; with a signal, an integral of x^3 exp(-x)."""
    region = several_bins("r", [3.0], {"background": [1e-9], "signal": [1.0]})
    weighing = weigh(templates(region, Uniform(0.0, 5.0)), closed_forms=closed_forms)
    assert weighing.evidences[0].ln_evidence == pytest.approx(-63.9616, abs=5e-5)
    exact = np.log(special.gammainc(4.0, 5.0) / 5.0)
    found, error = value(weighing.evidences[1])
    assert abs(found - exact) < 5.0 * error + 1e-8
    assert weighing.established


def test_tiny_expectations_of_everything_keep_their_bayes_factor() -> None:
    """Signal and background both of 1e-9 events: p1/p0 is the prior average of (1 + x)^3, (6^4 - 1)/20."""
    region = several_bins("r", [3.0, 0.0], {"background": [1e-9, 1e-9], "signal": [1e-9, 1e-9]})
    for closed_forms in (True, False):
        (comparison,) = weigh(templates(region, Uniform(0.0, 5.0)), closed_forms=closed_forms).comparisons
        error = comparison.ln_bayes_factor_error or 0.0
        assert ln_b(comparison) == pytest.approx(np.log((6.0**4 - 1.0) / 20.0), abs=5.0 * error + 1e-6)


# Uncertainties that are not a plain size.


@pytest.mark.parametrize(
    "effect", [(0.4, -0.2), (0.3, 0.1), (-0.2, -0.3)], ids=["asymmetric", "both up", "both down"]
)
def test_two_sided_uncertainties_are_their_integral(effect: tuple[float, float]) -> None:
    """Factor exp((u - d) z/2 + (u + d) g(z)/2), g(z) = (sqrt(z^2 + 1/16) - 1/4)/(sqrt(17/16) - 1/4)."""
    counts, background = np.array([14.0, 22.0]), np.array([10.0, 20.0])
    region = several_bins("r", counts, {"background": list(background), "signal": [3.0, 2.0]})
    analysis = templates(region, Exponential(1.0), (source("size", background=effect),))
    z, weight = standard_normal(60)
    u, d = np.log1p(effect)
    g = (np.sqrt(z**2 + 1.0 / 16.0) - 0.25) / (np.sqrt(17.0 / 16.0) - 0.25)
    mean = background * np.exp(0.5 * (u - d) * z + 0.5 * (u + d) * g)[:, None]
    exact = np.log(weight @ np.exp(stats.poisson.logpmf(counts, mean).sum(axis=1)))
    found, error = value(weigh(analysis).evidences[0])
    assert abs(found - exact) < 5.0 * error
    # The negative control: the same sizes taken as a plain, symmetric one.
    plain = templates(region, Exponential(1.0), (source("size", background=max(effect, key=abs)),))
    assert abs(value(weigh(plain).evidences[0])[0] - exact) > 10.0 * error


@pytest.mark.parametrize("effect", [(0.3, 0.1), (0.1, 0.2), (0.1, 0.1), (0.5, -0.05)], ids=str)
def test_a_signal_beside_a_source_with_two_modes_or_a_knee_is_established(
    effect: tuple[float, float],
) -> None:
    """Both ways up, the source has a saddle at 0 for small strengths and one maximum for large ones."""
    region = several_bins("r", [14.0, 22.0], {"background": [10.0, 20.0], "signal": [3.0, 2.0]})
    analysis = templates(region, Exponential(1.0), (source("size", background=effect),))
    rules = {"strength": under(Exponential(1.0), 0.0, 40.0, nodes=80), "size": standard_normal(60)}
    found, error = value(weigh(analysis).evidences[1])
    assert abs(found - ln_evidence(compile_model(analysis, SIGNAL), rules)) < 5.0 * error


@pytest.mark.parametrize("effect", [(0.2, -0.1), (0.3, -0.05), (0.3, -0.1), (0.5, -0.2)], ids=str)
@pytest.mark.parametrize("scale", [1.0, 10.0, 100.0])
def test_sizes_that_differ_up_and_down_are_established(effect: tuple[float, float], scale: float) -> None:
    """The knee at 0 put Laplace up to 0.4 off, and an evidence with one such source was not established."""
    columns = {"background": [10.0 * scale, 20.0 * scale], "signal": [3.0 * scale**0.5, 2.0 * scale**0.5]}
    region = several_bins("r", [np.round(11.0 * scale), np.round(22.0 * scale)], columns)
    analysis = templates(region, Exponential(1.0), (source("size", background=effect),))
    for evidence in weigh(analysis).evidences:
        model = compile_model(analysis, evidence.hypothesis)
        rules = {
            "size": standard_normal(60),
            "strength": under(Exponential(1.0), *np.linspace(0.0, 8.0, 33), 30.0),
        }
        found, error = value(evidence)
        # A knee leaves the weights a tail, and with it pulls that are wider than normal.
        assert abs(found - ln_evidence(model, rules)) < 5.0 * error + 0.01


def test_variations_on_one_side_are_asked_about() -> None:
    region = several_bins("r", [14.0, 22.0], {"background": [10.0, 20.0], "signal": [3.0, 2.0]})
    one_sided = templates(region, Exponential(1.0), (source("size", background=(0.3, 0.1)),))
    (caution,) = weigh(one_sided).cautions
    assert caution.code == "one-sided-reading"
    other = templates(region, Exponential(1.0), (source("size", background=0.3),))
    change = ln_b(weigh(other).comparisons[0]) - ln_b(weigh(one_sided).comparisons[0])
    first = caution.text.split("changes by ")[1].split(";")[0].replace("−", "-")
    assert float(first) == pytest.approx(change, abs=0.03)
    two_sided = templates(region, Exponential(1.0), (source("size", background=(0.3, -0.1)),))
    assert weigh(two_sided).cautions == ()


@pytest.mark.parametrize("width", [0.05, 0.3])
def test_a_nuisance_parameter_that_the_counts_cannot_measure_is_integrated_under_its_prior(
    width: float,
) -> None:
    """3 counts know the background's size to sqrt(3)/3 at best: its prior decides."""
    region = several_bins("r", [3.0], {"background": [3.0], "signal": [2.0]})
    analysis = templates(region, Exponential(1.0), (source("size", background=width),))
    model = compile_model(analysis, SIGNAL)
    rules = {"strength": under(Exponential(1.0), *np.linspace(0.0, 8.0, 9), 30.0), "size": standard_normal()}
    found, error = value(weigh(analysis).evidences[1])
    assert abs(found - ln_evidence(model, rules)) < 5.0 * error


@pytest.mark.parametrize(
    "level",
    [LogNormal(4.0, 1.5), Normal(4.0, 2.0, low=0.0), Gamma(2.0, 0.5), Uniform(0.0, 20.0)],
    ids=lambda p: p.text(),
)
def test_background_levels_of_every_prior_are_integrated(level: LogNormal | Normal | Gamma | Uniform) -> None:
    """A background known from its prior and from a control region only."""
    analysis = counting(6, level, Exponential(1.0), control=14)
    model = compile_model(analysis, SIGNAL)
    rules = {
        "strength": under(Exponential(1.0), *np.linspace(0.0, 5.0, 6), 20.0),
        "level": under(
            level, 0.0, 1.0, 2.0, 3.0, 4.0, 6.0, 8.0, 12.0, 20.0, 40.0 if level.support[1] > 20.0 else 20.1
        ),
    }
    found, error = value(weigh(analysis, closed_forms=False).evidences[1])
    assert abs(found - ln_evidence(model, rules)) < 5.0 * error
    assert TAU * 40.0 > 14.0


def test_an_evidence_that_is_not_established_keeps_its_estimators() -> None:
    """Six wild sources on three counts, most of them on one side only: whatever comes out, it is honest."""
    region = several_bins("r", [3.0], {"background": [1.0], "signal": [1.0]})
    wild = tuple(source(f"source {index}", background=(4.0, 8.0), signal=(6.0, 9.0)) for index in range(3))
    analysis = templates(region, Uniform(0.0, 5.0), wild)
    for evidence in (*weigh(analysis, engine="standard").evidences, *weigh(analysis).evidences):
        assert evidence.established == (evidence.reason == "")
        assert "sampling" in [one.name for one in evidence.estimates]
        assert all(np.isfinite(one.ln_evidence) for one in evidence.estimates)


def test_a_source_without_a_maximum_is_not_taken_for_an_enormous_evidence() -> None:
    """Up and down both +30 %: at 0 the integrand is lowest. Laplace's -1e300 stood among the estimates."""
    region = several_bins("r", [14.0, 22.0], {"background": [10.0, 20.0], "signal": [3.0, 2.0]})
    evidence = weigh(templates(region, Exponential(1.0), (source("size", background=(0.3, 0.3)),))).evidences[
        0
    ]
    assert all(one.ln_evidence > -1000.0 for one in evidence.estimates)
    assert "1e+300" not in evidence.reason


def test_template_errors_enter_the_evidence() -> None:
    """Background only, by hand: a product of negative binomials of shape T^2/V; scipy.stats.nbinom."""
    total, error = np.array([4.0, 9.0]), np.array([1.0, 2.0])
    region = several_bins(
        "r",
        [6.0, 5.0],
        {"background": list(total), "signal": [1.0, 2.0]},
        {"background": list(error)},
        template_errors=True,
    )
    shape = (total / error) ** 2
    exact = stats.nbinom.logpmf([6, 5], shape, shape / (shape + total)).sum()
    assert value(weigh(templates(region)).evidences[0])[0] == pytest.approx(exact, abs=1e-11)


def test_two_regions_enter_one_evidence() -> None:
    """Known expectations: the evidence is the product over both regions."""
    analysis = counting(6, 4.0, Exponential(1.0), control=14)
    exact = stats.poisson.logpmf(6, 4.0) + stats.poisson.logpmf(14, TAU * 4.0)
    assert value(weigh(analysis).evidences[0])[0] == pytest.approx(exact, abs=1e-12)
    fewer = replace(analysis, regions=(analysis.regions[0], one_bin("off", 15)))
    assert isinstance(fewer.regions[1].table, Table)
    assert weigh(fewer).evidences[0].ln_evidence != pytest.approx(exact, abs=1e-3)
