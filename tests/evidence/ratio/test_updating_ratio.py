"""The updating ratio against closed forms, brute quadrature and the engine with the parameters held."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import numpy.typing as npt
import pytest
from scipy import stats

from tests.evidence.brute_force import Rule, ln_evidence, panels, standard_normal
from tests.evidence.ratio.bumps import TO_FIVE, held, read, uncertain_bump
from tests.evidence.small_analyses import (
    TAU,
    YIELD,
    counting,
    one_bin,
    several_bins,
    source,
    templates,
)
from workbench.errors import InputError
from workbench.evidence.ratio.checking import scale_of
from workbench.evidence.ratio.results import Check, Scan
from workbench.evidence.updating_ratio import scan
from workbench.evidence.weigh import weigh
from workbench.hypotheses.analysis import Analysis, Hypothesis, Parameter
from workbench.hypotheses.priors import (
    Fixed,
    Gamma,
    Uniform,
)
from workbench.hypotheses.processes import Alternative, Contribution, Process
from workbench.hypotheses.shapes import Template
from workbench.likelihood.model import compile_model

Array = npt.NDArray[np.float64]

NO_SOURCES = 5e-4  # nats: only what lies between nodes is left


@pytest.fixture(scope="module")
def bumps() -> Scan:
    return scan(uncertain_bump(), seed=3)


def by_brute_force(analysis: Analysis, rules: dict[str, Rule], **values: float) -> float:
    """Return ln R by summing over a dense grid of the nuisance coordinates."""
    found = []
    for one in held(analysis, **values).hypotheses:
        model = compile_model(held(analysis, **values), one.name)
        found.append(ln_evidence(model, {name: rules[name] for name in model.names}))
    return found[1] - found[0]


def test_a_count_on_a_known_background_has_the_ratio_of_two_poisson_probabilities() -> None:
    """R(s) = Poisson(n | b + s S)/Poisson(n | b), by scipy; between the nodes and beyond the prior too."""
    found = scan(counting(9.0, 3.0, TO_FIVE))
    strengths = np.linspace(0.0, 10.0, 501)
    exact = stats.poisson.logpmf(9, 3.0 + YIELD * strengths) - stats.poisson.logpmf(9, 3.0)
    ln_ratio, error = read(found, *((s,) for s in strengths))
    assert found.established
    assert np.abs(ln_ratio - exact).max() < NO_SOURCES
    assert error.max() < 0.01
    assert found.known.ranges == {"strength": (0.0, 10.0)}


@pytest.mark.parametrize(
    ("count", "background"), [(0.0, 2.0), (1.0, 0.01), (1e6, 1e6), (4e6, 1e6), (3.0, 1e4)]
)
def test_it_is_right_for_deficits_strong_signals_and_backgrounds_of_next_to_nothing(
    count: float, background: float
) -> None:
    """Against scipy's Poisson probabilities, wherever R is within 8 nats of its peak."""
    size = max(np.sqrt(background), 1.0) * 300.0
    analysis = counting(count, background, Uniform(0.0, size))
    found = scan(analysis)
    strengths = np.concatenate([np.linspace(0.0, 2.0 * size, 2001), np.geomspace(1e-6, size, 2001)])
    exact = stats.poisson.logpmf(count, background + YIELD * strengths) - stats.poisson.logpmf(
        count, background
    )
    matters = exact > exact.max() - 8.0
    ln_ratio, error = read(found, *((s,) for s in strengths[matters]))
    gap = np.abs(ln_ratio - exact[matters])
    assert (gap <= 3.0 * error + NO_SOURCES).all()
    assert gap.max() < 0.02


def test_an_on_off_measurement_has_the_ratio_of_two_integrals_over_the_background() -> None:
    """p(n, m | s) = integral of gamma(b) Poisson(n | b + s S) Poisson(m | tau b) db, by Gauss-Legendre."""
    prior = stats.gamma(2.0, scale=4.0)
    found = scan(counting(15.0, Gamma(2.0, 0.25), TO_FIVE, control=22.0))
    level, weight = panels(*np.linspace(0.0, 60.0, 61))
    weight = weight * prior.pdf(level) * stats.poisson.pmf(22, TAU * level)
    strengths = np.linspace(0.0, 6.0, 61)
    joint = (stats.poisson.pmf(15, level[:, None] + YIELD * strengths) * weight[:, None]).sum(axis=0)
    exact = np.log(joint / joint[0])
    ln_ratio, error = read(found, *((s,) for s in strengths))
    pulls = (ln_ratio[1:] - exact[1:]) / error[1:]
    assert np.abs(pulls).max() < 4.0
    assert error.max() < 0.05


def test_a_bump_with_uncertainties_agrees_with_sums_over_a_dense_grid(bumps: Scan) -> None:
    """Twenty points drawn where R is within 8 nats of 1 or more; pulls add up to a chi-square."""
    analysis = uncertain_bump()
    rules = {"size": standard_normal(), "efficiency": standard_normal()}
    drawn = np.random.default_rng(5)
    points: list[tuple[float, float]] = []
    while len(points) < 20:
        strength, mass = float(5.0 * drawn.random() ** 2), float(drawn.uniform(1.0, 19.0))
        if read(bumps, (strength, mass))[0][0] > -8.0:
            points.append((strength, mass))
    ln_ratio, error = read(bumps, *points)
    exact = np.array([by_brute_force(analysis, rules, strength=s, mass=m) for s, m in points])
    pulls = (ln_ratio - exact) / error
    assert (pulls**2).sum() < stats.chi2(20).isf(1e-3)
    assert np.abs(ln_ratio - exact).max() < 0.05
    wrong = (ln_ratio + 0.1 - exact) / error
    assert (wrong**2).sum() > stats.chi2(20).isf(1e-3), "the negative control: a tenth of a nat shows"


def test_ratio_at_strength_0_is_exactly_1(bumps: Scan) -> None:
    masses = np.linspace(1.0, 19.0, 57)
    ln_ratio, error = read(bumps, *((0.0, mass) for mass in masses))
    assert bumps.is_nested
    assert np.abs(ln_ratio).max() < 1e-12
    assert error.max() == 0.0


@pytest.mark.parametrize("events", [None, 0.2])
def test_it_is_1_at_strength_0_with_template_errors_and_where_only_signal_fills_a_bin(
    events: float | None,
) -> None:
    columns = {"background": [3.0, 2.0, 0.0 if events else 1.0], "signal": [1.0, 1.0, 2.0]}
    errors = None if events else {"background": [0.5, 0.4, 0.6], "signal": [0.2, 0.2, 0.3]}
    region = several_bins(
        "r", [3.0, 3.0, 2.0], columns, errors, template_errors=events is None, empty_bin_events=events
    )
    found = scan(templates(region, TO_FIVE, (source("size", background=0.3),)))
    assert found.established, found.reason
    assert found.is_nested
    assert found.known.ln_ratio[0, 0] == 0.0
    assert abs(found.known.ln_ratio[0, 1]) > 1e-3, "the negative control: it moves away from 1"


def test_a_hypothesis_with_other_backgrounds_is_not_1_at_strength_0() -> None:
    """By hand: 5 counted, 3 or 3 + 2 expected without signal, so that R(0) = Poisson(5|5)/Poisson(5|3)."""
    region = one_bin("r", 5.0, known=3.0, extra=2.0, signal=1.0)
    base = templates(region, TO_FIVE)
    analysis = replace(
        base,
        hypotheses=(Hypothesis("known only", ("known",)), Hypothesis("more", ("known", "extra", "signal"))),
    )
    found = scan(analysis)
    assert found.established, found.reason
    assert not found.is_nested
    exact = stats.poisson.logpmf(5, 5.0) - stats.poisson.logpmf(5, 3.0)
    assert read(found, (0.0,))[0][0] == pytest.approx(exact, abs=1e-6)


def test_the_checks_at_points_between_nodes_agree_and_are_counted_into_the_error(bumps: Scan) -> None:
    assert len(bumps.checks) == 8
    assert max(abs(check.pull) for check in bumps.checks) < 4.0
    assert scale_of(bumps.checks) == pytest.approx(1.0)
    wrong = tuple(replace(check, direct=check.direct + 0.2) for check in bumps.checks)
    assert scale_of(wrong) > 5.0


def test_a_surface_that_disagrees_with_the_engine_is_not_established(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    """The negative control: strengths above 0.5 weighed 0.6 nats too high are seen, and no odds are given."""
    from workbench.evidence import updating_ratio
    from workbench.evidence.ratio.building import build

    def broken(*asked: object) -> object:
        surface, standing = build(*asked)  # type: ignore[arg-type]
        assert surface.strengths is not None
        lifted = surface.ln_ratio + np.where(surface.strengths.nodes > 0.5, 0.6, 0.0)
        return replace(surface, ln_ratio=lifted), standing

    monkeypatch.setattr(updating_ratio, "build", broken)
    found = scan(uncertain_bump(), seed=3)
    assert not found.established
    assert "more than" in found.reason
    assert found.reprior().ln_posterior_odds is None


@pytest.mark.parametrize("over", ["mass", "strength"])
def test_over_one_parameter_the_other_is_averaged_over_its_stated_prior(bumps: Scan, over: str) -> None:
    """Averaging in two steps is averaging at once; both read the same nodes, so that they agree closely."""
    one = scan(uncertain_bump(), (over,), seed=3)
    rest = {"mass": "strength", "strength": "mass"}[over]
    assert one.over == (over,)
    assert list(one.averaged) == [rest]
    assert list(one.priors) == [over]
    assert one.reprior().ln_bayes_factor == pytest.approx(bumps.reprior().ln_bayes_factor, abs=0.005)
    value = 7.2 if over == "mass" else 1.4
    direct = bumps.reprior({over: Fixed(value)}).ln_bayes_factor
    assert read(one, (value,))[0][0] == pytest.approx(direct, abs=0.005)
    if over == "strength":
        assert one.known.ln_ratio[0, 0] == pytest.approx(0.0, abs=1e-12)


def test_two_strengths_in_separate_bins_multiply_their_ratios() -> None:
    """R(s, t) = R(s) R(t) where nothing is shared, each a ratio of Poisson probabilities by scipy."""
    columns = {"background": [3.0, 5.0], "left": [2.0, 0.0], "right": [0.0, 4.0]}
    region = several_bins("r", [6.0, 9.0], columns)
    signals = [
        Process(name, "signal", {"r": Contribution(Template(name))}, factors=(f"{name} strength",))
        for name in ("left", "right")
    ]
    analysis = Analysis(
        title="Two",
        regions=(region,),
        parameters=tuple(Parameter(f"{name} strength", TO_FIVE) for name in ("left", "right")),
        processes=(
            Process("background", "background", {"r": Contribution(Template("background"))}),
            *signals,
        ),
    )
    found = scan(analysis)
    assert found.established, found.reason
    points = np.random.default_rng(1).uniform(0.0, 4.0, size=(50, 2))
    exact = stats.poisson.logpmf(6, 3.0 + 2.0 * points[:, 0]) - stats.poisson.logpmf(6, 3.0)
    exact += stats.poisson.logpmf(9, 5.0 + 4.0 * points[:, 1]) - stats.poisson.logpmf(9, 5.0)
    ln_ratio, error = read(found, *(tuple(point) for point in points))
    assert (np.abs(ln_ratio - exact) <= 3.0 * error + NO_SOURCES).all()
    assert np.abs(ln_ratio - exact).max() < 0.02
    assert abs(read(found, (0.0, 0.0))[0][0]) < 1e-12


def test_a_mass_alone_is_scanned_where_the_strength_is_held() -> None:
    analysis = held(uncertain_bump(), strength=1.5)
    found = scan(analysis)
    assert (found.over, found.is_nested, found.established) == (("mass",), False, True)
    rules = {"size": standard_normal(), "efficiency": standard_normal()}
    for mass in (3.21, 7.3, 15.0):
        ln_ratio, error = read(found, (mass,))
        exact = by_brute_force(uncertain_bump(), rules, strength=1.5, mass=mass)
        assert abs(ln_ratio[0] - exact) < 4.0 * error[0]


def test_the_same_seed_gives_the_same_numbers_and_another_one_others_within_the_errors(bumps: Scan) -> None:
    again, other = scan(uncertain_bump(), seed=3), scan(uncertain_bump(), seed=4)
    assert np.array_equal(again.known.ln_ratio, bumps.known.ln_ratio)
    _, ln_ratio, error = bumps.peak
    _, elsewhere, its_error = other.peak
    assert ln_ratio != elsewhere
    assert abs(ln_ratio - elsewhere) < 4.0 * np.hypot(error, its_error)


def test_without_an_evidence_there_is_no_surface_but_a_reason() -> None:
    region = several_bins("r", [3.0, 1.0], {"background": [3.0, 0.0], "signal": [1.0, 1.0]})
    found = scan(templates(region, TO_FIVE))
    assert (found.established, found.surface) == (False, None)
    assert "no parameter value can produce" in found.reason
    with pytest.raises(InputError, match="R is known nowhere"):
        found.reprior()


@pytest.mark.parametrize(
    ("over", "hypothesis", "words"),
    [
        (("size",), None, "no signal parameter"),
        (("mas",), None, 'write "mass"'),
        (("mass", "mass"), None, "named twice"),
        ((), None, "without a free signal parameter"),
        (("mass",), "background only", "others are compared with"),
        (("mass",), "signal", "No such hypothesis"),
    ],
)
def test_what_cannot_be_scanned_is_refused(over: tuple[str, ...], hypothesis: str | None, words: str) -> None:
    with pytest.raises(InputError) as caught:
        scan(uncertain_bump(), over, hypothesis=hypothesis)
    assert words in str(caught.value)


def test_a_held_parameter_is_not_scanned() -> None:
    with pytest.raises(InputError, match=r"held at 1\.5"):
        scan(held(uncertain_bump(), strength=1.5), ("strength",))


def test_a_pull_is_the_difference_in_units_of_both_errors() -> None:
    assert Check({}, 1.0, 0.3, 2.0, 0.4).pull == pytest.approx(-2.0)


def test_over_alternatives_of_a_background_it_is_the_ratio_of_the_averages() -> None:
    """R(s) = sum_v P(v) Poisson(9 | b_v + 2 s)/sum_v P(v) Poisson(9 | b_v), by scipy."""
    region = one_bin("r", 9.0, few=4.0, many=7.0, signal=2.0)
    into = [Contribution(Template(name)) for name in ("few", "many")]
    alternatives = (
        Alternative("few", {"r": into[0]}, prior=3.0),
        Alternative("many", {"r": into[1]}, prior=1.0),
    )
    base = templates(one_bin("r", 9.0, few=4.0, signal=2.0), TO_FIVE)
    (_, signal) = base.processes
    analysis = replace(
        base,
        regions=(region,),
        processes=(Process("few", "background", {}, alternatives=alternatives), signal),
    )
    found = scan(analysis)
    assert found.established, found.reason
    strengths = np.linspace(0.0, 8.0, 81)
    share = np.array([[0.75], [0.25]])
    background = np.array([[4.0], [7.0]])
    above = (share * stats.poisson.pmf(9, background + 2.0 * strengths)).sum(axis=0)
    exact = np.log(above / (share * stats.poisson.pmf(9, background)).sum())
    ln_ratio, error = read(found, *((s,) for s in strengths))
    assert found.is_nested
    assert np.abs(ln_ratio - exact).max() < NO_SOURCES + 3.0 * error.max()
    assert error.max() < 0.01
    comparison = weigh(analysis).comparisons[0]
    assert found.ln_bayes_factor == pytest.approx(comparison.ln_bayes_factor, abs=1e-9)
