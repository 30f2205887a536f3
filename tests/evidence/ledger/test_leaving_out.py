"""What ln B is without a bin or a region: weighted anew or afresh, it is what quadrature says."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import numpy.typing as npt
import pytest

from tests.analyses import everything
from tests.evidence.ledger import enumerated
from tests.evidence.small_analyses import counting, several_bins, templates
from workbench.evidence.formulas.closed_forms import ln_known_background_exponential
from workbench.evidence.ledger import changes
from workbench.evidence.ledger.annealing import annealed
from workbench.evidence.ledger.bridge import Bridge, bridge, rungs_of
from workbench.evidence.ledger.changes import reweighted
from workbench.evidence.ledger.leaving_out import leave_out
from workbench.evidence.ledger.ledger import ledger
from workbench.evidence.ledger.members import members_of
from workbench.evidence.ledger.results import AFRESH, EXACT, REWEIGHTED
from workbench.evidence.ledger.without import without
from workbench.evidence.weigh import weigh_hypothesis
from workbench.hypotheses.distortion import Distortion
from workbench.hypotheses.priors import Exponential
from workbench.likelihood.laws import bin_ln_probability
from workbench.likelihood.model import Model, compile_model

Array = npt.NDArray[np.float64]
Flags = npt.NDArray[np.bool_]

SIGNAL = "signal plus background"


def singles(bins: int) -> list[Flags]:
    return [np.arange(bins) == one for one in range(bins)]


def model_of_everything() -> Model:
    """Return every shape, factor, effect and law, and a distortion."""
    analysis = everything()
    hypotheses = tuple(replace(one, distortion=Distortion(0.05)) for one in analysis.hypotheses)
    return compile_model(replace(analysis, hypotheses=hypotheses), SIGNAL)


def some_points(model: Model, number: int = 7) -> Array:
    return np.random.default_rng(4).normal(0.0, 0.8, (number, model.size))


def test_all_other_bins_keep_what_is_expected_in_them() -> None:
    """Also in the first and last bin, whose removal must not change how shapes are normalised."""
    model = model_of_everything()
    seeds = model.seeds(some_points(model))
    before, spread = model.expected(seeds)
    taken = np.isin(np.arange(model.bins), [0, 3, model.bins - 1])
    after, after_spread = without(model, taken).expected(seeds)
    assert spread is not None
    assert after_spread is not None
    np.testing.assert_allclose(after[:, ~taken], before[:, ~taken], rtol=1e-14)
    np.testing.assert_allclose(after_spread[:, ~taken], spread[:, ~taken], rtol=1e-14)
    assert (after[:, taken] == 0.0).all()
    assert (after_spread[:, taken] == 0.0).all()


def test_bins_that_are_taken_out_say_nothing_and_derivatives_follow() -> None:
    model = model_of_everything()
    assert model.observed is not None
    points = some_points(model)
    taken = np.isin(np.arange(model.bins), [0, 3, model.bins - 1])
    other = without(model, taken)
    assert other.observed is not None
    each = bin_ln_probability(*model.expected(model.seeds(points)), model.observed)
    value, gradient, hessian = other.derivatives(other.seeds(points), other.observed)
    np.testing.assert_allclose(value, each[:, ~taken].sum(axis=1), rtol=1e-12)
    step = 1e-5
    for index in range(model.size):
        moved = points.copy()
        moved[:, index] += step
        up = other.derivatives(other.seeds(moved), other.observed)
        moved[:, index] -= 2.0 * step
        down = other.derivatives(other.seeds(moved), other.observed)
        np.testing.assert_allclose(gradient[:, index], (up[0] - down[0]) / (2 * step), rtol=1e-4, atol=1e-4)
        np.testing.assert_allclose(hessian[:, index], (up[1] - down[1]) / (2 * step), rtol=1e-4, atol=1e-3)


@pytest.mark.parametrize("power", [0.4, 0.01])
def test_the_annealed_likelihood_is_the_likelihood_to_a_power(power: float) -> None:
    """Poisson: exactly, but for a constant."""
    analysis = everything(template_errors=False)
    model, weaker = (compile_model(one, SIGNAL) for one in (analysis, annealed(analysis, power)))
    assert model.observed is not None
    points = some_points(model)
    whole = model.ln_likelihood(model.seeds(points), model.observed)
    part = weaker.ln_likelihood(weaker.seeds(points), power * model.observed)
    np.testing.assert_allclose(part - part[0], power * (whole - whole[0]), rtol=1e-9, atol=1e-9)


def test_annealing_weakens_template_errors_as_well() -> None:
    """Large counts, where the negative binomial is nearly normal: only ln of its width does not follow."""
    counts, width = [9000.0, 14000.0], [300.0, 200.0]
    region = several_bins(
        "r",
        counts,
        {"background": [9000.0, 10500.0], "signal": [0.0, 500.0]},
        {"background": width},
        template_errors=True,
    )
    model, weaker = (
        compile_model(one, SIGNAL) for one in (templates(region), annealed(templates(region), 0.1))
    )
    points = np.array([[-1.5], [0.0], [1.0], [1.5]])
    whole = model.ln_likelihood(model.seeds(points), np.array(counts))
    part = weaker.ln_likelihood(weaker.seeds(points), 0.1 * np.array(counts))
    np.testing.assert_allclose(part - part[1], 0.1 * (whole - whole[1]), rtol=0.02, atol=0.1)


def of(name: str, seed: int = 1) -> tuple[Model, Bridge]:
    model = compile_model(enumerated.analysis(), name)
    assert model.observed is not None
    rungs = rungs_of(model, model.observed)
    assert rungs is not None
    return model, bridge(rungs, np.random.SeedSequence(seed), 64)


@pytest.mark.parametrize("name", enumerated.NAMES)
@pytest.mark.parametrize("is_afresh", [False, True])
def test_without_each_bin_the_evidence_is_what_quadrature_sums(name: str, *, is_afresh: bool) -> None:
    model, draws = of(name)
    evidence = weigh_hypothesis(model, np.random.SeedSequence(2)).evidence
    groups = [*singles(4), np.array([True, True, False, False])]
    members = members_of(enumerated.analysis(), evidence)
    found = leave_out(members, evidence, None if is_afresh else draws, groups, np.random.SeedSequence(3))
    for group, one in zip(groups, found, strict=True):
        kept = tuple(int(index) for index in np.flatnonzero(~group))
        exact = enumerated.ln_probability(name, kept)
        assert one.ln_evidence is not None
        assert one.error is not None
        assert one.way == (AFRESH if is_afresh else REWEIGHTED)
        assert 0.0 < one.error < 0.02
        assert abs(one.ln_evidence - exact) < 4.0 * one.error
        change = enumerated.ln_probability(name, (0, 1, 2, 3)) - exact
        assert abs((one.change or 0.0) - change) < 4.0 * (one.change_error or 0.0)


def test_errors_of_reweighting_are_of_the_right_size() -> None:
    """Pulls over 60 seeds and four bins; and, as a negative control, weights of another bin are seen."""
    model, _ = of(SIGNAL)
    evidence = weigh_hypothesis(model, np.random.SeedSequence(2)).evidence
    exact = enumerated.ln_probability(SIGNAL, (0, 1, 2, 3))
    found: list[float] = []
    wrong: list[float] = []
    for seed in range(60):
        _, draws = of(SIGNAL, seed)
        for index in range(4):
            change = exact - enumerated.ln_probability(SIGNAL, tuple(one for one in range(4) if one != index))
            for kept, pulls in ((index, found), ((index + 1) % 4, wrong)):
                one = reweighted(evidence, draws.ln_whole, draws.ln_whole - draws.ln_bins[kept])
                assert one is not None
                assert one.change is not None
                assert one.change_error is not None
                pulls.append((one.change - change) / one.change_error)
    assert 0.5 < np.mean(np.square(found)) < 1.8
    assert abs(np.mean(found)) < 4.0 / np.sqrt(60.0)
    assert np.mean(np.square(wrong)) > 100.0


def test_weights_with_a_heavy_tail_are_not_used() -> None:
    """Draws of a normal law weighted to one of twice its width: no variance, k-hat near 3/4."""
    t = np.random.default_rng(1).normal(size=16 * 400)
    evidence = weigh_hypothesis(of(SIGNAL)[0], np.random.SeedSequence(2)).evidence
    assert reweighted(evidence, np.zeros(t.size), 0.5 * t * t) is None
    assert reweighted(evidence, np.zeros(t.size), 0.05 * t * t) is not None


@pytest.mark.parametrize("limit", ["_LARGEST_ERROR", "_HEAVIEST"])
def test_poor_weights_are_replaced_by_a_fresh_evidence(limit: str, monkeypatch: pytest.MonkeyPatch) -> None:
    """Judged so strictly that no weights pass, every bin has an evidence of its own."""
    monkeypatch.setattr(changes, limit, -1e9)
    (account,) = ledger(enumerated.analysis(), by=("bins",), orders=4).accounts
    assert {part.way for part in account.bins} == {AFRESH}
    assert {part.k_hat for part in account.bins} == {None}
    for index, part in enumerate(account.bins):
        assert part.without is not None
        assert part.without_error is not None
        assert abs(part.without - enumerated.without((index,))) < 4.0 * part.without_error


def test_without_the_control_region_the_other_count_stands_alone() -> None:
    """A known background and an exponential strength: both ways out have closed forms."""
    analysis = counting(8, 3.0, Exponential(1.0), control=12)
    (account,) = ledger(analysis, by=("regions",)).accounts
    on, off = account.regions
    alone = ln_known_background_exponential(8, 3.0, 6.0) - (8 * np.log(3.0) - 3.0 - np.log(40320.0))
    assert off.way == EXACT
    assert off.without == pytest.approx(alone, abs=1e-10)
    assert off.observed == 12
    assert on.without == pytest.approx(0.0, abs=1e-12)
