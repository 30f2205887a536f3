"""The engine against slow references of random analyses: its errors must be true.

Source of the right values: `references/make.py`, which shares no code with the engine.
All 300 are held against it by `python -m tests.evidence.references.campaign`; ten are repeated in full here.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace

import dynesty
import numpy as np
import numpy.typing as npt
import pytest
from scipy import special, stats

from tests.evidence.references import pulls, saved
from tests.evidence.references.cases import SEED, TOTAL, case
from tests.evidence.references.direct import Direct
from tests.evidence.references.making import reference
from tests.evidence.references.pulls import Answer, answered
from workbench.evidence.integral.proposal import Proposal
from workbench.evidence.results import Weighing
from workbench.evidence.weigh import weigh
from workbench.hypotheses.analysis import Analysis

# One of each of ten kinds.
TEN = (5, 13, 15, 19, 22, 23, 24, 28, 32, 33)
FIRST, ROWS = saved.read()


def too_far(answers: Sequence[Answer]) -> list[str]:
    """Return what is wrong with answers: one far outside, or all of them together too far."""
    of_each = np.concatenate([one.pulls[1:] for one in answers])
    limit = float(stats.chi2.isf(1e-5, of_each.size))
    found = [pulls.told(one) for one in answers if max(map(abs, one.pulls)) > 4.0]
    square = float((of_each**2).sum())
    return found + ([f"sum of squared pulls {square:.0f}, more than {limit:.0f}"] if square > limit else [])


@pytest.fixture(scope="module")
def answers() -> list[Answer]:
    return [answered(number, ROWS) for number in TEN]


def test_saved_references_come_from_this_script_and_these_analyses() -> None:
    assert saved.heading() == FIRST
    assert {number for number, _ in ROWS} == set(range(TOTAL))
    for number in range(TOTAL):
        one = case(number)
        for hypothesis in one.analysis.hypotheses:
            row = ROWS[number, hypothesis.name]
            assert row.kind == one.kind
            assert saved.is_same(saved.fingerprint(Direct(one.analysis, hypothesis.name)), row.fingerprint)


def test_a_fingerprint_tells_other_counts_and_other_priors() -> None:
    one = case(1).analysis
    right = saved.fingerprint(Direct(one, one.hypotheses[0].name))
    other = case(13).analysis
    assert not saved.is_same(right, saved.fingerprint(Direct(other, other.hypotheses[0].name)))
    assert not saved.is_same(right, " ".join(f"{float(part) + 1e-3:.7g}" for part in right.split()))


@pytest.mark.slow
@pytest.mark.parametrize("number", TEN)
def test_a_reference_made_again_from_other_random_numbers_is_the_same(number: int) -> None:
    for place, hypothesis in enumerate(case(number).analysis.hypotheses):
        row = ROWS[number, hypothesis.name]
        direct = Direct(case(number).analysis, hypothesis.name)
        again = reference(direct, (SEED, number, place, 1), wanted=1.5e-3, most=2**18)
        assert abs(again.ln_evidence - row.ln_evidence) < 4.0 * np.hypot(again.error, row.error)


@pytest.mark.slow
def test_ten_evidences_and_their_ratios_lie_within_their_errors(answers: list[Answer]) -> None:
    assert all(one.established for one in answers)
    assert all(one.reference <= one.stated / 3.0 for one in answers)
    assert not too_far(answers)


@pytest.mark.slow
@pytest.mark.parametrize("number", [26, 50])
def test_where_quadrature_and_sampling_miss_a_maximum_another_engine_finds_it(number: int) -> None:
    """Laplace and sampling were both wrong, and annealing had to agree with one of them."""
    one = answered(number, ROWS)
    assert one.established
    assert max(map(abs, one.pulls)) < 4.0


@pytest.mark.slow
@pytest.mark.parametrize("number", [13, 24, 33])
def test_nested_sampling_finds_no_gross_error(number: int) -> None:
    """A check of gross errors only: dynesty, at three combined errors."""
    analysis = case(number).analysis
    hypothesis = analysis.hypotheses[-1].name
    direct, row = Direct(analysis, hypothesis), ROWS[number, hypothesis]
    sampler = dynesty.NestedSampler(
        lambda point: float(direct.ln_likelihood(np.asarray(point)[None])[0]),
        special.ndtri,
        direct.size,
        nlive=100,
        rstate=np.random.default_rng(number),
        sample="rwalk",
    )
    sampler.run_nested(print_progress=False, dlogz=0.1)
    error = float(sampler.results.logzerr[-1])
    assert error < 0.5
    assert abs(float(sampler.results.logz[-1]) - row.ln_evidence) < 3.0 * np.hypot(error, row.error)


@pytest.mark.slow
def test_an_error_five_times_too_small_is_seen(monkeypatch: pytest.MonkeyPatch) -> None:
    """A negative control."""
    monkeypatch.setattr(pulls, "weigh", _sure_of_itself)
    assert too_far([answered(number, ROWS) for number in TEN])


def _sure_of_itself(analysis: Analysis, *, seed: int) -> Weighing:
    weighing = weigh(analysis, seed=seed)
    told = [replace(one, error=(one.error or 0.0) / 5.0) for one in weighing.evidences]
    return replace(weighing, evidences=tuple(told))


@pytest.mark.slow
def test_a_proposal_density_off_by_a_tenth_is_seen(monkeypatch: pytest.MonkeyPatch) -> None:
    """A negative control."""
    right: Callable[..., npt.NDArray[np.float64]] = Proposal.ln_density
    monkeypatch.setattr(Proposal, "ln_density", lambda *given: right(*given) + np.log(1.1))
    assert too_far([answered(number, ROWS) for number in TEN])
    monkeypatch.setattr(pulls, "weigh", _by_the_standard_engine)
    broken = [answered(number, ROWS) for number in TEN]
    assert all(max(map(abs, one.pulls[1:])) > 4.0 or not one.established for one in broken)


def _by_the_standard_engine(analysis: Analysis, *, seed: int) -> Weighing:
    """Return what quadrature and sampling say; by default annealing would mend what is broken."""
    return weigh(analysis, seed=seed, engine="standard")
