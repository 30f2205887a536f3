"""Break points against closed forms, and against sums and minimisers that share no code with the engine."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt
import pytest
from scipy import integrate, optimize, special, stats

import workbench as wb
from tests.analyses import background, region_of, seen_bump, signal
from workbench.evidence.breaking import pairs, search
from workbench.evidence.breaking.pairs import declared_pair, pair_at
from workbench.evidence.breaking.question import asked
from workbench.evidence.breaking.results import Breaking
from workbench.evidence.breaking.search import Target, nearest
from workbench.hypotheses.shapes import Flat, Template
from workbench.likelihood.distortions import held_distortion, smooth_functions
from workbench.likelihood.model import Model

Array = npt.NDArray[np.float64]

EVENTS = np.array([60.0, 50.0, 40.0, 30.0, 20.0])
BUMP = np.array([0.0, 3.0, 9.0, 3.0, 0.0])
OBSERVED = np.array([61.0, 55.0, 58.0, 33.0, 18.0])


def one_count(observed: float, expected: float, strength: wb.Uniform | wb.Exponential) -> wb.Analysis:
    return wb.Analysis(
        "One count",
        (region_of([0.0, 1.0], [observed]),),
        (wb.Parameter("strength", strength),),
        (background("known", Flat(), expected), signal("sought", Flat(), 4.0, "strength")),
    )


def five_bins(*sources: wb.Uncertainty, errors: float = 0.0, times: float = 1.0) -> wb.Analysis:
    """Return the bins; with `times` of the events and the same excess in standard deviations."""
    given = {"b": errors * EVENTS} if errors else None
    observed, bump = counted(times)
    return wb.Analysis(
        "Five bins",
        (region_of(np.arange(6.0), observed, {"b": times * EVENTS, "s": bump}, given),),
        (wb.Parameter("strength", wb.Uniform(0.0, 5.0)),),
        (background("known", Template("b")), signal("bump", Template("s"), None, "strength")),
        tuple(sources),
    )


def counted(times: float) -> tuple[Array, Array]:
    return np.round(times * EVENTS + np.sqrt(times) * (OBSERVED - EVENTS)), np.sqrt(times) * BUMP


def summed(factor: Array, spread: float = 0.0, times: float = 1.0) -> float:
    """Return ln B of the five bins by plain sums over strength and one normalisation, by scipy's pmf."""
    number = 300 if times == 1.0 else 80
    strengths = 5.0 * (np.arange(number) + 0.5) / number
    observed, bump = counted(times)
    z = (
        (np.linspace(-6.0, 6.0, 60) if times == 1.0 else np.linspace(-2.5, 2.5, 240))
        if spread
        else np.zeros(1)
    )
    level = ((1.0 + spread) ** z)[:, None] * times * EVENTS * factor
    nothing = stats.poisson.logpmf(observed, level).sum(axis=-1)
    both = stats.poisson.logpmf(observed, level[:, None] + strengths[:, None] * bump).sum(axis=-1)
    weight = np.exp(-0.5 * z * z)
    weight /= weight.sum()
    up = special.logsumexp(both, b=weight[:, None] / strengths.size)
    return float(up - special.logsumexp(nothing, b=weight))


def smallest(functions: Array, below: float, spread: float = 0.0, times: float = 1.0) -> Array:
    """Return the smallest coefficients at the threshold, the best of several constrained descents."""
    generator = np.random.default_rng(7)
    found = []
    far = 0.1 / np.sqrt(times) * generator.standard_normal((6 if times == 1.0 else 1, len(functions)))
    for start in [np.full(len(functions), 0.01 / np.sqrt(times)), *far]:
        ended = optimize.minimize(
            lambda c: float(c @ c),
            start,
            method="SLSQP",
            constraints=[
                {"type": "ineq", "fun": lambda c: below - summed(np.exp(c @ functions), spread, times)},
            ],
            options={"ftol": 1e-12, "maxiter": 200},
        )
        if ended.success:
            found.append(ended.x)
    return np.asarray(min(found, key=lambda c: float(c @ c)))


@pytest.mark.parametrize("strength", [wb.Uniform(0.0, 8.0), wb.Exponential(1.5)])
@pytest.mark.parametrize(("observed", "below"), [(18.0, 0.0), (25.0, 3.0), (18.0, -0.5)])
def test_a_known_background_under_one_count_breaks_where_one_equation_says(
    strength: wb.Uniform | wb.Exponential, observed: float, below: float
) -> None:
    """ln B(f) = ln of the integral of Poisson(n; 10 f + 4 s) p(s) ds / Poisson(n; 10 f), by scipy's quad."""

    def ln_b(factor: float) -> float:
        density = np.exp(strength.ln_density(np.array([1.0])))[0]

        def integrand(s: float) -> float:
            prior = density if isinstance(strength, wb.Uniform) else np.exp(-s / 1.5) / 1.5
            return float(prior * stats.poisson.pmf(observed, 10.0 * factor + 4.0 * s))

        last = 8.0 if isinstance(strength, wb.Uniform) else 40.0
        whole, _ = integrate.quad(integrand, 0.0, last, epsrel=1e-10)
        return float(np.log(whole) - stats.poisson.logpmf(observed, 10.0 * factor))

    found = wb.break_point(one_count(observed, 10.0, strength), below=below, within=1.0)
    wanted = optimize.brentq(lambda f: ln_b(f) - below, 1.0, 2.5) - 1.0
    assert found.ending is Breaking.FOUND
    assert found.ln_bayes_factor == pytest.approx(ln_b(1.0), abs=1e-8)
    assert found.under_peak == pytest.approx(found.rms)
    assert found.under_peak == pytest.approx(wanted, abs=0.003)
    assert found.stated_before == found.stated_after == 0.0


@pytest.mark.parametrize(("terms", "below"), [(1, 1.0), (2, 1.0), (3, 1.0), (3, 0.3)])
def test_the_smallest_distortion_of_a_known_background_is_the_one_that_a_minimiser_finds(
    terms: int, below: float
) -> None:
    found = wb.break_point(five_bins(), below=below, terms=terms)
    wanted = smallest(smooth_functions(EVENTS, terms), below)
    (distorted,) = found.distorted
    assert found.ending is Breaking.FOUND
    assert np.linalg.norm(distorted.coefficients) == pytest.approx(np.linalg.norm(wanted), rel=0.01)
    assert np.array(distorted.coefficients) == pytest.approx(wanted, abs=0.05 * float(np.linalg.norm(wanted)))
    assert summed(1.0 + distorted.change) == pytest.approx(below, abs=0.02)


def test_a_distortion_of_only_half_the_size_is_seen_by_the_sums(monkeypatch: pytest.MonkeyPatch) -> None:
    """Negative control: with the engine's backgrounds distorted half as much, the sums disagree."""

    def halved(model: Model, factors: Array) -> Model:
        return held_distortion(model, np.sqrt(factors))

    monkeypatch.setattr(pairs, "held_distortion", halved)
    found = wb.break_point(five_bins(), below=1.0, terms=3)
    wanted = smallest(smooth_functions(EVENTS, 3), 1.0)
    size = np.linalg.norm(found.distorted[0].coefficients) if found.distorted else 0.0
    assert size != pytest.approx(float(np.linalg.norm(wanted)), rel=0.3)


def test_what_a_declared_uncertainty_absorbs_does_not_break_and_needs_another_shape() -> None:
    """With a free level, ten per cent wide, the level is no way out: the sums say so, and the search."""
    analysis = five_bins(wb.Uncertainty("level", (wb.Effect("known", 0.10),)))
    found = wb.break_point(analysis, below=1.0, terms=3)
    wanted = smallest(smooth_functions(EVENTS, 3), 1.0, 0.10)
    (distorted,) = found.distorted
    assert np.linalg.norm(distorted.coefficients) == pytest.approx(np.linalg.norm(wanted), rel=0.02)
    assert np.array(distorted.coefficients) == pytest.approx(wanted, abs=0.1 * float(np.linalg.norm(wanted)))
    assert found.stated_before == pytest.approx(0.10, rel=0.1)
    assert found.stated_after is not None
    assert 0.02 < found.stated_after < 0.09
    level, known = (wb.break_point(one, below=1.0, terms=1).rms or 0.0 for one in (analysis, five_bins()))
    flat = np.ones((1, 5))
    assert level == pytest.approx(np.expm1(abs(smallest(flat, 1.0, 0.10)[0])), rel=0.02)
    assert known == pytest.approx(np.expm1(abs(smallest(flat, 1.0)[0])), rel=0.01)
    assert level > 1.4 * known


def test_many_counts_are_searched_by_quadrature_where_draws_tell_too_little() -> None:
    """The same excess in standard deviations on 10,000 times the events: a hundredth of the distortion."""
    times = 1e4
    analysis = five_bins(wb.Uncertainty("level", (wb.Effect("known", 0.01),)), times=times)
    found = wb.break_point(analysis, below=1.0, terms=3)
    wanted = smallest(smooth_functions(EVENTS, 3), 1.0, 0.01, times)
    (distorted,) = found.distorted
    assert found.ending is Breaking.FOUND
    assert np.linalg.norm(distorted.coefficients) == pytest.approx(np.linalg.norm(wanted), rel=0.03)
    assert summed(1.0 + distorted.change, 0.01, times) == pytest.approx(1.0, abs=0.03)


def test_slopes_by_quadrature_are_those_of_the_sums() -> None:
    """Central differences of plain sums at a distortion, with and without an uncertain level."""
    functions, place = smooth_functions(EVENTS, 3), np.array([0.02, -0.03, 0.03])
    for spread, sources in ((0.0, ()), (0.1, (wb.Uncertainty("level", (wb.Effect("known", 0.1),)),))):
        question = asked(five_bins(*sources), 0.0, None, 3, None, 0.5, 1)
        tilt = pair_at(question, place, declared_pair(question)).tilt()
        for term in range(3):
            step = 1e-3 * np.eye(3)[term]
            up, down = (summed(np.exp((place + way * step) @ functions), spread) for way in (1.0, -1.0))
            assert tilt[term] == pytest.approx((up - down) / 2e-3, rel=0.05, abs=0.2)


def test_a_search_that_ran_out_of_steps_says_so(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(search, "_MOST_ANCHORS", 1)
    found = wb.break_point(five_bins(times=1e4), below=-20.0, within=0.5)
    assert found.ending is Breaking.NOT_SETTLED
    assert not found.ending.is_answer
    assert found.under_peak is None


def test_how_it_ended_is_said_and_nothing_is_made_up() -> None:
    below = wb.break_point(five_bins(), below=50.0)
    assert below.ending is Breaking.BELOW_ALREADY
    assert below.under_peak is None
    assert below.distorted == ()
    far = wb.break_point(five_bins(), below=-8.0, within=0.02)
    assert far.ending is Breaking.NOT_WITHIN
    assert far.under_peak is None
    assert far.reached is not None
    assert far.ln_bayes_factor is not None
    assert -8.0 < far.reached < far.ln_bayes_factor
    assert np.linalg.norm(far.distorted[0].coefficients) == pytest.approx(np.log(1.02), rel=1e-3)


def test_an_evidence_that_is_not_established_gives_no_break_point() -> None:
    region = region_of([0.0, 1, 2], [3.0, 2], {"b": [4.0, 0.0], "s": [1.0, 0.0]})
    analysis = wb.Analysis(
        "A bin that nothing fills",
        (region,),
        (wb.Parameter("strength", wb.Uniform(0.0, 5.0)),),
        (background("known", Template("b")), signal("bump", Template("s"), None, "strength")),
    )
    found = wb.break_point(analysis)
    assert found.ending is Breaking.NOT_ESTABLISHED
    assert "no parameter value" in found.reason
    assert found.ln_bayes_factor is None


@pytest.mark.parametrize("errors", [0.0, 0.08])
def test_draws_carry_ln_b_and_its_slope_to_where_the_engine_finds_them(errors: float) -> None:
    """A step of some per cent by reweighting, against fresh evidences there and differences of them."""
    analysis = five_bins(wb.Uncertainty("level", (wb.Effect("known", 0.05),)), errors=errors)
    question = asked(analysis, 0.0, None, 3, None, 0.5, 1)
    origin = declared_pair(question)
    place = np.array([0.02, -0.03, 0.03])
    carried, made = origin.trial(place), pair_at(question, place, origin)
    error = float(np.hypot(origin.error, made.error))
    assert carried.is_reliable
    assert carried.ln_bayes_factor == pytest.approx(made.ln_bayes_factor, abs=4.0 * error)
    assert abs(origin.ln_bayes_factor - made.ln_bayes_factor) > 8.0 * error  # a step that did nothing fails
    for term in range(3):
        step = 1e-4 * np.eye(3)[term]
        up, down = (origin.trial(place + way * step).ln_bayes_factor for way in (1.0, -1.0))
        assert carried.slope[term] == pytest.approx((up - down) / 2e-4, rel=1e-4, abs=1e-5)


@dataclass(frozen=True)
class Drawn:
    """A surface with the look of a pair of evidences, for the search alone."""

    coefficients: Array
    surface: Callable[[Array], float]
    reason: str = ""
    error: float = 0.0

    @property
    def ln_bayes_factor(self) -> float:
        return self.surface(self.coefficients)

    def trial(self, coefficients: Array) -> Drawn:
        return replace(self, coefficients=coefficients)

    @property
    def is_reliable(self) -> bool:
        return bool(np.linalg.norm(coefficients := self.coefficients) < 10.0) and coefficients.size > 0

    @property
    def slope(self) -> Array:
        steps = 1e-6 * np.eye(self.coefficients.size)
        return np.array(
            [
                (self.surface(self.coefficients + s) - self.surface(self.coefficients - s)) / 2e-6
                for s in steps
            ]
        )


def two_valleys(c: Array) -> float:
    """Fall slowly along the first axis from the start on, and steeply along the second beyond 0.1."""
    return float(5.0 - 10.0 * c[0] - 80.0 * max(0.0, abs(c[1]) - 0.1))


def test_the_search_leaves_the_nearest_slope_for_a_nearer_way_out() -> None:
    origin = Drawn(np.zeros(2), two_valleys)
    ways = np.array([[1.0, 0.0], [0.0, 1.0], [-1.0, 0.0], [0.0, -1.0]])
    target = Target(2.0, 0.5)

    def make(c: Array) -> Drawn:
        return Drawn(c, two_valleys)

    alone = nearest(make, origin, target, np.zeros((0, 2)))  # type: ignore[arg-type]
    found = nearest(make, origin, target, ways)  # type: ignore[arg-type]
    wanted = optimize.minimize(
        lambda c: float(c @ c),
        np.array([0.0, 0.2]),
        method="SLSQP",
        constraints=[{"type": "ineq", "fun": lambda c: 2.0 - two_valleys(c)}],
    ).x
    assert np.linalg.norm(alone.coefficients) == pytest.approx(0.3, rel=0.01)
    assert np.linalg.norm(found.coefficients) == pytest.approx(np.linalg.norm(wanted), rel=0.02)


def test_the_same_seed_gives_the_same_numbers_and_another_agrees_within_errors() -> None:
    analysis = seen_bump(2.0, 46.0)
    first, again, other = (wb.break_point(analysis, below=3.0, seed=seed) for seed in (1, 1, 2))
    assert (first.under_peak, first.reached) == (again.under_peak, again.reached)
    assert first.under_peak is not None
    assert other.under_peak is not None
    error = float(np.hypot(first.under_peak_error or 0.0, other.under_peak_error or 0.0))
    assert other.under_peak == pytest.approx(first.under_peak, abs=5.0 * error)


@pytest.mark.parametrize(
    ("options", "words"),
    [
        ({"below": float("nan")}, "threshold"),
        ({"terms": 0}, "terms"),
        ({"terms": 2.5}, "terms"),
        ({"within": 0.0}, "range"),
        ({"within": 3.0}, "range"),
        ({"regions": ["elsewhere"]}, "not declared"),
        ({"regions": []}, "No region"),
        ({"hypothesis": "background only"}, "without a signal"),
        ({"hypothesis": "backgruond"}, "No hypothesis"),
        ({"terms": 6}, "More terms"),
    ],
)
def test_a_question_without_an_answer_is_refused(options: dict[str, object], words: str) -> None:
    with pytest.raises(wb.InputError, match=words):
        wb.break_point(five_bins(), **options)


def test_every_wrong_number_is_told_at_once() -> None:
    with pytest.raises(wb.InputError) as refusal:
        wb.break_point(five_bins(), below=float("inf"), terms=11, within=-1.0, regions=["peek"])
    assert len(refusal.value.problems) == 4


def test_one_bin_has_one_term_where_none_are_asked_for_and_a_declared_distortion_says_how_many() -> None:
    assert wb.break_point(one_count(18.0, 10.0, wb.Uniform(0.0, 8.0)), below=0.0).terms == 1
    analysis = five_bins()
    neither = wb.Hypothesis("neither", ("known",), distortion=wb.Distortion(0.05, 2))
    declared = replace(analysis, hypotheses=(*analysis.hypotheses, neither))
    assert wb.break_point(declared, below=1.0).terms == 2
    assert wb.break_point(declared, below=1.0, terms=4).terms == 4
