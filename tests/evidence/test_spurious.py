"""The signal that a background would fake: fits and evidences of expected counts.

Held against scipy's minimiser and sums over a grid, neither of which shares code with the engine.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import numpy.typing as npt
import pytest
from scipy import optimize, special, stats

import workbench as wb
from tests.evidence.test_averaging import PEAK, exponential, known, power, shaped, sure
from workbench.evidence.backgrounds import AVERAGE, Backgrounds, Fake, backgrounds
from workbench.evidence.spurious import FakedStrength, faked_strengths
from workbench.hypotheses.alternatives import variants_of
from workbench.likelihood.model import compile_model

Array = npt.NDArray[np.float64]
BOTH = "signal plus background"
SHAPES = {"exponential": exponential, "power": power}


def planned(analysis: wb.Analysis) -> wb.Analysis:
    """Return the analysis without observed counts."""
    regions = [replace(one, table=replace(one.table, observed=None, digest="")) for one in analysis.regions]
    return replace(analysis, regions=tuple(regions))


@pytest.fixture(scope="module")
def found() -> Backgrounds:
    return backgrounds(shaped())


@pytest.fixture(scope="module")
def before_data() -> Backgrounds:
    return backgrounds(planned(shaped()))


def of(result: Backgrounds, truth: str, fitted: str) -> Fake:
    return next(one for one in result.fakes if (one.truth, one.fitted) == (truth, fitted))


def strength(result: Backgrounds, truth: str, fitted: str) -> FakedStrength:
    (one,) = of(result, truth, fitted).strengths
    return one


def by_scipy(counts: Array, fitted: str) -> tuple[float, float]:
    """Return the strength that scipy finds, and its error from differences of the ln likelihood."""
    middle = {"exponential": 4.0, "power": 0.9}[fitted]

    def cost(x: Array) -> float:
        expected = np.asarray(1.1 ** x[2] * SHAPES[fitted](x[1]) + x[0] * PEAK)
        if (expected <= 0.0).any():
            return 1e9
        return float((expected - counts * np.log(expected)).sum()) + 0.5 * float(x[2]) ** 2

    options = {"xatol": 1e-9, "fatol": 1e-12, "maxiter": 20_000, "maxfev": 20_000}
    best = optimize.minimize(cost, [0.1, middle, 0.0], method="Nelder-Mead", options=options).x
    step = np.array([1e-3, 1e-3, 1e-3])
    hessian = np.empty((3, 3))
    for i in range(3):
        for j in range(3):
            a, b = np.eye(3)[i] * step[i], np.eye(3)[j] * step[j]
            hessian[i, j] = (
                cost(best + a + b) - cost(best + a - b) - cost(best - a + b) + cost(best - a - b)
            ) / (4.0 * step[i] * step[j])
    return float(best[0]), float(np.sqrt(np.linalg.inv(hessian)[0, 0]))


def ln_evidence(counts: Array, shape: str, *, has_signal: bool) -> float:
    """Return the ln evidence of counts that need not be whole, summed over a grid of midpoints."""
    low, high = {"exponential": (2.0, 6.0), "power": (0.3, 1.5)}[shape]
    z = (np.arange(60) + 0.5) / 5.0 - 6.0
    strengths = (np.arange(80) + 0.5) / 20.0 if has_signal else np.zeros(1)
    terms = []
    for number in range(120):
        background = SHAPES[shape](low + (number + 0.5) / 120.0 * (high - low))
        expected = (1.1**z)[:, None, None] * background + strengths[None, :, None] * PEAK
        ln_p = (counts * np.log(expected) - expected - special.gammaln(counts + 1.0)).sum(axis=-1)
        terms.append(ln_p + stats.norm.logpdf(z)[:, None] + np.log(0.2 / 120.0 / strengths.size))
    return float(special.logsumexp(np.array(terms)))


def test_the_expected_counts_before_data_are_those_at_the_medians(before_data: Backgrounds) -> None:
    """By hand: scale 4, index 0.9, size 1."""
    assert not before_data.is_fitted
    assert before_data.weighing is None
    assert before_data.expected == pytest.approx(np.array([exponential(4.0), power(0.9)]), rel=1e-9)


def test_the_expected_counts_after_data_are_those_of_the_fit(found: Backgrounds) -> None:
    for counts, variant in zip(found.expected, variants_of(shaped()), strict=True):
        assert counts == pytest.approx(wb.fit(variant.analysis, "background only").expected)


@pytest.mark.parametrize(("truth", "fitted"), [("power", "exponential"), ("exponential", "power")])
def test_the_faked_strength_is_what_another_minimiser_finds(
    before_data: Backgrounds, truth: str, fitted: str
) -> None:
    counts = before_data.expected[before_data.names.index(truth)]
    value, error = by_scipy(counts, fitted)
    one = strength(before_data, truth, fitted)
    assert one.value == pytest.approx(value, abs=1e-4)
    assert one.error == pytest.approx(error, rel=1e-3)
    assert one.events == pytest.approx(value * PEAK.sum(), abs=1e-3)
    assert one.events_error == pytest.approx(error * PEAK.sum(), rel=1e-3)
    assert one.in_errors == pytest.approx(value / error, abs=1e-3)


def test_what_one_shape_lacks_the_other_has_too_much_of(before_data: Backgrounds) -> None:
    """A deficit is a fake too: it hides signals."""
    signs = [
        np.sign(strength(before_data, *pair).value)
        for pair in (("power", "exponential"), ("exponential", "power"))
    ]
    assert sorted(signs) == [-1.0, 1.0]


def test_a_background_at_its_own_medians_fakes_nothing(before_data: Backgrounds) -> None:
    for name in before_data.names:
        assert abs(sure(strength(before_data, name, name).in_errors)) < 1e-5
        assert before_data.ln_faked(of(before_data, name, name)) == (0.0, 0.0)


@pytest.mark.parametrize("fitted", ["exponential", "power"])
def test_the_faked_bayes_factor_is_that_of_counts_that_are_not_whole(
    before_data: Backgrounds, fitted: str
) -> None:
    counts = before_data.expected[before_data.names.index("power")]
    assert np.abs(counts - np.round(counts)).max() > 0.1
    reference = ln_evidence(counts, fitted, has_signal=True) - ln_evidence(counts, fitted, has_signal=False)
    fake = of(before_data, "power", fitted)
    assert fake.established
    assert abs(sure(fake.ln_bayes_factor) - reference) < 4.0 * sure(fake.ln_bayes_factor_error) + 2e-3
    rounded = np.round(counts)
    wrong = ln_evidence(rounded, fitted, has_signal=True) - ln_evidence(rounded, fitted, has_signal=False)
    assert abs(sure(fake.ln_bayes_factor) - wrong) > 4.0 * sure(fake.ln_bayes_factor_error) + 2e-3


def test_the_average_is_weighed_with_the_priors(before_data: Backgrounds) -> None:
    counts = before_data.expected[0]
    sides = [
        special.logsumexp(
            [ln_evidence(counts, name, has_signal=has_signal) for name in ("exponential", "power")],
            b=[0.75, 0.25],
        )
        for has_signal in (True, False)
    ]
    fake = of(before_data, "exponential", AVERAGE)
    assert sure(fake.ln_bayes_factor) == pytest.approx(
        sides[0] - sides[1], abs=4.0 * sure(fake.ln_bayes_factor_error) + 2e-3
    )
    assert fake.strengths == ()


def test_what_is_faked_is_the_change_from_the_truth(found: Backgrounds) -> None:
    own, other = of(found, "power", "power"), of(found, "power", "exponential")
    change = found.ln_faked(other)
    assert change is not None
    assert change[0] == sure(other.ln_bayes_factor) - sure(own.ln_bayes_factor)


def test_the_largest_fake_is_of_another_alternative(found: Backgrounds) -> None:
    largest = found.largest_fake("power")
    assert largest is not None
    assert largest == ("exponential", strength(found, "exponential", "power"))


def test_a_notable_fake_is_said_and_a_small_one_is_not() -> None:
    assert "spurious-signal" in [one.code for one in backgrounds(planned(shaped())).cautions]
    near = known(4.0, 4.001, observed=4.0)
    assert "spurious-signal" not in [one.code for one in backgrounds(near).cautions]


def test_one_bin_fakes_the_difference_of_its_backgrounds() -> None:
    """By hand: 6 events on 3 known are 3/1.5 = 2 units of signal, with the error sqrt(6)/1.5."""
    result = backgrounds(known(3.0, 6.0))
    one = strength(result, "6 events", "3 events")
    assert [one.value, one.events] == pytest.approx([2.0, 3.0])
    assert one.error == pytest.approx(np.sqrt(6.0) / 1.5)
    missing = strength(result, "3 events", "6 events")
    assert [missing.value, missing.events] == pytest.approx([-2.0, -3.0])


def test_closed_forms_that_count_whole_events_are_left_aside() -> None:
    """3.7 events expected, weighed with 3 known: by scipy's quadrature over an exponential strength."""
    result = backgrounds(known(3.0, 3.7))

    def ln_p(expected: Array) -> Array:
        return np.asarray(3.7 * np.log(expected) - expected - special.gammaln(4.7))

    s = np.linspace(0.0, 60.0, 600_001)
    with_signal = np.trapezoid(np.exp(ln_p(3.0 + 1.5 * s) - s / 2.0) / 2.0, s)
    fake = of(result, "3.7 events", "3 events")
    tolerance = 4.0 * sure(fake.ln_bayes_factor_error) + 1e-3
    assert sure(fake.ln_bayes_factor) == pytest.approx(
        np.log(with_signal) - float(ln_p(np.array(3.0))), abs=tolerance
    )


def test_a_free_place_is_where_the_fit_found_the_signal() -> None:
    parameters = (*shaped().parameters, wb.Parameter("mass", wb.Uniform(2.0, 8.0)))
    peak = wb.Process(
        "peak", "signal", {"only": wb.Contribution(wb.Gaussian("mass", 0.7), 10.0)}, ("strength",)
    )
    analysis = replace(shaped(), parameters=parameters, processes=(shaped().processes[0], peak))
    model = compile_model(variants_of(analysis)[0].analysis, BOTH)
    counts = exponential(4.0) + 2.0 * np.diff(stats.norm.cdf(np.linspace(1.0, 9.0, 9), 6.3, 0.7)) * 10.0
    (one,) = faked_strengths(model, counts)
    assert one.value == pytest.approx(2.0, abs=1e-3)
    assert dict(one.at) == {"mass": pytest.approx(6.3, abs=1e-3)}


def test_a_signal_of_known_size_has_no_strength_to_fake() -> None:
    sought = wb.Process("sought", "signal", {"only": wb.Contribution(wb.Flat(), 1.5)})
    analysis = replace(known(3.0, 6.0), processes=(known(3.0, 6.0).processes[0], sought), parameters=())
    result = backgrounds(analysis)
    assert all(one.strengths == () for one in result.fakes)
    assert of(result, "6 events", "3 events").ln_bayes_factor == pytest.approx(
        6.0 * np.log(4.5 / 3.0) - 1.5, abs=1e-9
    )
    assert result.largest_fake("3 events") is None


def test_the_same_seed_gives_the_same_numbers(found: Backgrounds) -> None:
    assert [one.ln_bayes_factor for one in backgrounds(shaped()).fakes] == [
        one.ln_bayes_factor for one in found.fakes
    ]


@pytest.mark.parametrize(
    ("analysis", "hypothesis", "what"),
    [
        (variants_of(shaped())[0].analysis, None, "No background is in doubt"),
        (shaped(), "background only", "Nothing to compare the first hypothesis with"),
        (shaped(), "signal", "No hypothesis of this name"),
        (
            replace(shaped(), hypotheses=shaped().hypotheses[:1]),
            None,
            "Nothing to compare the first hypothesis with",
        ),
    ],
)
def test_what_cannot_be_compared_is_refused(analysis: wb.Analysis, hypothesis: str | None, what: str) -> None:
    with pytest.raises(wb.InputError) as refusal:
        backgrounds(analysis, hypothesis)
    assert [problem.what for problem in refusal.value.problems] == [what]
