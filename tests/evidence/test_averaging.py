"""Evidences averaged over alternatives of the backgrounds.

Held against Poisson sums and integrals of scipy that share no code with the engine, against the rules of
probability, and against hand-built evidences where the rule is what is tested.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import numpy.typing as npt
import pytest
from scipy import integrate, stats

import workbench as wb
from tests.analyses import region_of
from workbench.evidence.averaging import DISTRUST, NEGLIGIBLE, averaged, likeliest, variant_seed
from workbench.evidence.results import AlternativeEvidence, Estimate, Evidence
from workbench.evidence.weigh import weigh
from workbench.hypotheses.alternatives import variants_of

Array = npt.NDArray[np.float64]
EDGES = np.linspace(1.0, 9.0, 9)
COUNTS = np.array([31.0, 22, 17, 15, 14, 7, 8, 5])
PEAK = (stats.norm.cdf(EDGES[1:], 5.0, 0.7) - stats.norm.cdf(EDGES[:-1], 5.0, 0.7)) * 10.0


def known(*rates: float, weights: tuple[float, ...] = (), observed: float = 7.0) -> wb.Analysis:
    """Return one bin whose background is one of several known numbers, and a signal of unknown strength."""
    described = [{"only": wb.Contribution(wb.Flat(), rate)} for rate in rates]
    priors = weights or (1.0,) * len(rates)
    return wb.Analysis(
        "One bin",
        (region_of([0.0, 1.0], [observed]),),
        (wb.Parameter("strength", wb.Exponential(2.0)),),
        (
            wb.Process(
                "known",
                "background",
                {},
                alternatives=tuple(
                    wb.Alternative(f"{rate:g} events", one, prior)
                    for rate, one, prior in zip(rates, described, priors, strict=True)
                ),
            ),
            wb.Process("sought", "signal", {"only": wb.Contribution(wb.Flat(), 1.5)}, ("strength",)),
        ),
    )


def shaped() -> wb.Analysis:
    """Return eight bins on a background that is an exponential or a power law, each of unknown steepness."""
    falling = {"only": wb.Contribution(wb.Falling("scale"), (100.0, "size"))}
    power = {"only": wb.Contribution(wb.PowerLaw("index"), (110.0, "size"))}
    return wb.Analysis(
        "Two shapes",
        (region_of(EDGES, COUNTS),),
        (
            wb.Parameter("strength", wb.Uniform(0.0, 4.0)),
            wb.Parameter("scale", wb.Uniform(2.0, 6.0)),
            wb.Parameter("index", wb.Uniform(0.3, 1.5)),
            wb.Parameter("size", wb.LogNormal(1.0, 1.1)),
        ),
        (
            wb.Process(
                "falling spectrum",
                "background",
                {},
                alternatives=(wb.Alternative("exponential", falling, 3.0), wb.Alternative("power", power)),
            ),
            wb.Process(
                "peak", "signal", {"only": wb.Contribution(wb.Gaussian(5.0, 0.7), 10.0)}, ("strength",)
            ),
        ),
    )


def exponential(scale: float) -> Array:
    below = np.exp(-(EDGES - EDGES[0]) / scale)
    return np.asarray(100.0 * (below[:-1] - below[1:]) / (1.0 - below[-1]))


def power(index: float) -> Array:
    above = EDGES ** (1.0 - index)
    return np.asarray(110.0 * np.diff(above) / (above[-1] - above[0]))


def brute_force(shape: str, *, has_signal: bool) -> float:
    """Return the ln evidence of one shape by summing scipy's Poisson probabilities over a grid."""
    low, high, of = {"exponential": (2.0, 6.0, exponential), "power": (0.3, 1.5, power)}[shape]
    steps = 120
    z = (np.arange(60) + 0.5) / 60.0 * 12.0 - 6.0
    weight = stats.norm.pdf(z) * 12.0 / 60.0
    size = 1.1**z
    strengths = (np.arange(60) + 0.5) / 60.0 * 4.0 if has_signal else np.zeros(1)
    total = 0.0
    for number in range(steps):
        background = of(low + (number + 0.5) / steps * (high - low))
        expected = size[:, None, None] * background + strengths[None, :, None] * PEAK
        likelihood = np.exp(stats.poisson.logpmf(COUNTS, expected).sum(axis=-1))
        total += float((weight[:, None] * likelihood).sum()) / steps / strengths.size
    return float(np.log(total))


def sure(value: float | None) -> float:
    assert value is not None
    return value


def hand_built(
    name: str, prior: float, ln_evidence: float, error: float = 0.01, **more: object
) -> AlternativeEvidence:
    estimates = (Estimate("sampling", ln_evidence, error, 0.1, 1024),)
    evidence = Evidence("this", ln_evidence, error, True, "", estimates)
    return AlternativeEvidence(name, prior, replace(evidence, **more))  # type: ignore[arg-type]


def test_known_backgrounds_are_averaged_as_poisson_probabilities_are() -> None:
    """By hand: P(7) = (2 pois(7; 3) + pois(7; 6))/3, and with 1.5 s added, s exponential of mean 2."""
    weighing = weigh(known(3.0, 6.0, weights=(2.0, 1.0)))
    without = (2.0 * stats.poisson.pmf(7, 3.0) + stats.poisson.pmf(7, 6.0)) / 3.0

    def with_signal(rate: float) -> float:
        value, _ = integrate.quad(
            lambda s: stats.poisson.pmf(7, rate + 1.5 * s) * np.exp(-s / 2.0) / 2.0, 0.0, 80.0, limit=200
        )
        return float(value)

    average = (2.0 * with_signal(3.0) + with_signal(6.0)) / 3.0
    first, second = weighing.evidences
    assert first.ln_evidence == pytest.approx(np.log(without), abs=1e-10)
    assert second.ln_evidence == pytest.approx(np.log(average), abs=1e-6)
    assert (first.error, second.error) == (0.0, 0.0)
    (comparison,) = weighing.comparisons
    assert comparison.ln_bayes_factor == pytest.approx(np.log(average / without), abs=1e-6)
    alone = [one.ln_bayes_factor for one in comparison.alternatives]
    assert alone == pytest.approx(
        [np.log(with_signal(rate) / stats.poisson.pmf(7, rate)) for rate in (3.0, 6.0)], abs=1e-6
    )


def test_posterior_probabilities_of_the_alternatives_are_bayes_theorem() -> None:
    first = weigh(known(3.0, 6.0, weights=(2.0, 1.0))).evidences[0]
    joint = np.array([2.0, 1.0]) / 3.0 * stats.poisson.pmf(7, [3.0, 6.0])
    assert [one.prior for one in first.alternatives] == pytest.approx([2 / 3, 1 / 3])
    assert [one.posterior for one in first.alternatives] == pytest.approx(joint / joint.sum(), abs=1e-10)


def test_shapes_with_parameters_of_their_own_are_averaged_as_by_brute_force() -> None:
    weighing = weigh(shaped())
    for evidence, has_signal in zip(weighing.evidences, (False, True), strict=True):
        each = [brute_force(name, has_signal=has_signal) for name in ("exponential", "power")]
        expected = np.logaddexp(each[0] + np.log(0.75), each[1] + np.log(0.25))
        assert evidence.established
        assert abs(sure(evidence.ln_evidence) - expected) < 4.0 * sure(evidence.error) + 1e-3
        for one, reference in zip(evidence.alternatives, each, strict=True):
            assert abs(sure(one.evidence.ln_evidence) - reference) < 4.0 * sure(one.evidence.error) + 1e-3
        if not has_signal:  # with a signal the two shapes are as good as one another
            wrong = np.logaddexp(each[0] + np.log(0.25), each[1] + np.log(0.75))
            assert abs(sure(evidence.ln_evidence) - wrong) > 10.0 * sure(evidence.error) + 1e-3


def test_equal_alternatives_change_nothing() -> None:
    alternatives = tuple(
        wb.Alternative(name, {"only": wb.Contribution(wb.Flat(), 4.0)}, prior)
        for name, prior in (("one", 1.0), ("other", 2.0))
    )
    first, signal = known(4.0, 5.0).processes
    same = replace(known(4.0, 5.0), processes=(replace(first, alternatives=alternatives), signal))
    one, two = weigh(same), weigh(variants_of(known(4.0, 5.0))[0].analysis)
    assert one.comparisons[0].ln_bayes_factor == pytest.approx(two.comparisons[0].ln_bayes_factor, abs=1e-12)


def test_the_average_lies_between_what_it_is_an_average_of() -> None:
    for evidence in weigh(shaped()).evidences:
        values = [sure(one.evidence.ln_evidence) for one in evidence.alternatives]
        assert min(values) < sure(evidence.ln_evidence) < max(values)


def test_the_error_is_that_of_a_weighted_sum() -> None:
    """Of 3:1 at equal evidences, errors 0.02 and 0.08: sqrt((0.75 * 0.02)^2 + (0.25 * 0.08)^2) = 0.025."""
    found = averaged("this", [hand_built("a", 0.75, -5.0, 0.02), hand_built("b", 0.25, -5.0, 0.08)])
    assert found.ln_evidence == pytest.approx(-5.0)
    assert found.error == pytest.approx(0.025)
    assert [one.posterior for one in found.alternatives] == pytest.approx([0.75, 0.25])


def test_the_error_of_the_average_covers_its_spread_over_seeds() -> None:
    """Pulls of 12 seeds have a variance near 1; beyond 4 it has a chance below 1e-5 (scipy's chi2)."""
    found = [weigh(shaped(), seed=seed).evidences[1] for seed in range(12)]
    values = np.array([one.ln_evidence for one in found])
    pulls = (values - values.mean()) / np.array([one.error for one in found])
    assert float((pulls**2).sum()) / 11.0 < 4.0


def test_an_alternative_that_matters_and_is_not_established_takes_the_average_with_it() -> None:
    doubtful = hand_built("b", 0.5, -6.0, established=False, reason="a few draws dominate")
    found = averaged("this", [hand_built("a", 0.5, -5.0), doubtful])
    assert not found.established
    assert found.reason == 'with "b", a few draws dominate'
    assert found.ln_evidence == pytest.approx(np.log(0.5 * np.exp(-5.0) + 0.5 * np.exp(-6.0)))
    assert all(one.posterior is None for one in found.alternatives)


def test_one_without_any_estimate_matters_however_small_its_prior() -> None:
    nothing = AlternativeEvidence("b", 1e-12, Evidence("this", None, None, False, "none", ()))
    found = averaged("this", [hand_built("a", 1.0 - 1e-12, -5.0), nothing])
    assert not found.established
    assert found.ln_evidence is None


def test_one_that_is_far_too_small_to_matter_is_passed_over_and_paid_for_in_the_error() -> None:
    """Its largest conceivable share: exp(-30 + 10 + 5 * 0.2 + 5) times 0.5/0.5 of the other's evidence."""
    doubtful = hand_built("b", 0.5, -30.0, 0.2, established=False, reason="none")
    found = averaged("this", [hand_built("a", 0.5, -5.0, 0.01), doubtful])
    assert found.established
    assert found.ln_evidence == pytest.approx(np.log(0.5) - 5.0)
    assert found.error == pytest.approx(0.01 + np.exp(-30.0 + DISTRUST + 1.0 + 5.0))
    assert [one.posterior for one in found.alternatives] == [pytest.approx(1.0), None]


def test_the_limit_of_what_matters_is_where_it_is_said_to_be() -> None:
    edge = -5.0 - DISTRUST - 5.0 * 0.01 + np.log(NEGLIGIBLE)
    for shift, is_established in ((-0.01, True), (0.01, False)):
        doubtful = hand_built("b", 0.5, edge + shift, established=False, reason="none")
        assert averaged("this", [hand_built("a", 0.5, -5.0), doubtful]).established is is_established


def test_the_likeliest_variant_is_the_one_with_the_largest_prior_times_evidence() -> None:
    analysis = known(3.0, 6.0, weights=(9.0, 1.0))
    first = weigh(analysis).evidences[0]
    joint = [9.0 * stats.poisson.pmf(7, 3.0), stats.poisson.pmf(7, 6.0)]
    assert likeliest(variants_of(analysis), first).name == ("3 events" if joint[0] > joint[1] else "6 events")


def test_a_hypothesis_without_the_process_in_doubt_is_not_averaged() -> None:
    analysis = known(3.0, 6.0)
    sure = wb.Process("sure", "background", {"only": wb.Contribution(wb.Flat(), 5.0)})
    names = ("sure", "known")
    with_sure = replace(
        analysis,
        processes=(*analysis.processes, sure),
        hypotheses=tuple(wb.Hypothesis(name, (name,)) for name in names),
    )
    plain, average = weigh(with_sure).evidences
    assert plain.alternatives == ()
    assert plain.ln_evidence == pytest.approx(stats.poisson.logpmf(7, 5.0))
    assert average.ln_evidence == pytest.approx(np.log(0.5 * stats.poisson.pmf(7, [3.0, 6.0]).sum()))


def test_two_processes_in_doubt_are_averaged_over_every_combination() -> None:
    analysis = known(3.0, 6.0, weights=(2.0, 1.0))
    alternatives = tuple(
        wb.Alternative(name, {"only": wb.Contribution(wb.Flat(), rate)}, prior)
        for name, rate, prior in (("few", 0.5, 1.0), ("many", 2.0, 3.0))
    )
    other = wb.Process("other", "background", {}, alternatives=alternatives)
    both = replace(analysis, processes=(*analysis.processes, other), hypotheses=())
    first = weigh(both).evidences[0]
    total = sum(
        p * q * stats.poisson.pmf(7, a + b)
        for a, p in ((3.0, 2 / 3), (6.0, 1 / 3))
        for b, q in ((0.5, 0.25), (2.0, 0.75))
    )
    assert first.ln_evidence == pytest.approx(np.log(total), abs=1e-10)
    assert len(first.alternatives) == 4


def test_a_strength_prior_of_half_the_width_is_averaged_like_any_other() -> None:
    (item,) = weigh(shaped()).comparisons[0].sensitivity
    parameters = tuple(
        replace(one, prior=wb.Uniform(0.0, 2.0)) if one.name == "strength" else one
        for one in shaped().parameters
    )
    (other,) = weigh(replace(shaped(), parameters=parameters)).comparisons
    tolerance = 4.0 * sure(other.ln_bayes_factor_error) + 0.01
    assert item.halved == pytest.approx(other.ln_bayes_factor, abs=tolerance)


def test_variants_draw_from_seeds_of_their_own_and_the_same_seed_gives_the_same_numbers() -> None:
    assert len({variant_seed(1, place) for place in range(64)} | {1}) == 65
    once, again, other = (weigh(shaped(), seed=seed).evidences[1].ln_evidence for seed in (1, 1, 2))
    assert once == again != other


def test_a_far_spread_of_the_bayes_factor_is_said() -> None:
    assert [one.code for one in weigh(known(2.0, 9.0)).cautions] == ["depends-on-the-background"]
    assert weigh(known(4.0, 4.2)).cautions == ()
