"""Which engine makes a number, why, and when it is established beside the others."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from tests.evidence.brute_force import ln_evidence, standard_normal
from tests.evidence.resonances import expected, ln_evidences, resonances
from tests.evidence.small_analyses import TAU, YIELD, bump, counting, several_bins, source, templates
from workbench.errors import InputError
from workbench.evidence import engines
from workbench.evidence.drawn import Drawn, nothing_drawn
from workbench.evidence.engines import agree, joined
from workbench.evidence.formulas import closed_forms
from workbench.evidence.results import Estimate, Evidence
from workbench.evidence.weigh import weigh
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.priors import Exponential, Gamma
from workbench.likelihood.model import compile_model

SIGNAL = "signal plus background"


def same_side() -> Analysis:
    """Return three sources that only raise the background, which leave quadrature and sampling apart."""
    region = several_bins("r", [20.0, 35.0], {"background": [10.0, 20.0], "signal": [3.0, 2.0]})
    sources = tuple(source(f"size {k}", background=(0.3, 0.3 - 0.05 * k)) for k in range(3))
    return templates(region, Exponential(1.0), sources)


def evidence(*estimates: Estimate, established: bool = True, reason: str = "") -> Evidence:
    last = estimates[-1] if estimates else None
    value, error = (None, None) if last is None else (last.ln_evidence, last.error)
    return Evidence("h", value, error, established, reason, estimates)


def drawn(value: float, error: float = 0.02, doubt: str = "") -> Drawn:
    return replace(nothing_drawn("annealing", 2, doubt), ln_evidence=value, error=error)


QUADRATURE = Estimate("quadrature", -10.0, 0.05, None, 100)
SAMPLING = Estimate("sampling", -10.02, 0.01, 0.2, 2048)


# Where the standard engine establishes nothing.


def test_what_the_standard_pair_leaves_open_is_annealed_and_says_so() -> None:
    analysis = same_side()
    standard = weigh(analysis, engine="standard").evidences[0]
    found = weigh(analysis).evidences[0]
    assert not standard.established
    assert standard.engine == "standard"
    assert found.established, found.reason
    assert (found.engine, found.engine_reason) == ("annealed", standard.reason)
    assert [one.name for one in found.estimates] == ["Laplace", "sampling", "annealing"]
    assert found.ln_evidence == found.estimates[-1].ln_evidence
    rules = {f"size {k}": standard_normal(12) for k in range(3)}
    exact = ln_evidence(compile_model(analysis, "background only"), rules)
    assert found.error is not None
    assert found.ln_evidence == pytest.approx(exact, abs=5.0 * found.error)


@pytest.mark.slow
def test_two_resonances_are_weighed_against_one_and_none() -> None:
    """Four long axes: no grid holds them. All three evidences against brute force."""
    counts = np.random.default_rng(4).poisson(expected(40, (6.0, 28.0), (13.0, 18.0))).astype(float)
    weighing = weigh(resonances(counts, 2))
    assert weighing.established
    assert [one.engine for one in weighing.evidences] == ["standard", "standard", "annealed"]
    assert "more nodes than can be held" in weighing.evidences[2].engine_reason
    exact = ln_evidences(counts)
    for found, value in zip(weighing.evidences, exact, strict=True):
        assert found.ln_evidence is not None
        assert found.error is not None
        assert abs(found.ln_evidence - value) < 4.0 * found.error + 0.005
    prior = np.array([1.0, 0.5, 0.25])
    posterior = prior * np.exp(np.array(exact) - max(exact))
    for known, value in zip(weighing.posteriors, posterior / posterior.sum(), strict=True):
        assert known.probability is not None
        assert known.error is not None
        assert abs(known.probability - value) < 4.0 * known.error + 0.001


def test_what_the_standard_pair_establishes_stays_as_it_is() -> None:
    analysis = bump(np.arange(40.0)[::-1], uncertainties=(source("size", continuum=0.1),))
    assert weigh(analysis).evidences == weigh(analysis, engine="standard").evidences


def test_counts_that_nothing_can_produce_are_not_annealed() -> None:
    region = several_bins("r", [3.0, 1.0], {"background": [2.0, 0.0], "signal": [1.0, 0.0]})
    sources = (source("size", background=0.2),)
    found = weigh(templates(region, Exponential(1.0), sources)).evidences[0]
    assert "no parameter value can produce" in found.reason
    assert found.engine == "standard"


# An engine asked for by name.


def test_annealing_can_be_asked_for_and_stands_beside_the_closed_form() -> None:
    analysis = counting(8, Gamma(1.5, 0.1), Exponential(1.0), control=14)
    exact = closed_forms.ln_on_off_signal(8, 14, TAU, (1.5, 0.1), (1.0, 1.0 / YIELD))
    found = weigh(analysis, engine="annealed").evidences[1]
    assert [one.name for one in found.estimates] == ["closed form", "annealing"]
    assert found.established
    assert (found.engine, found.engine_reason) == ("annealed", "")
    assert found.error is not None
    assert found.error > 0.0
    assert found.ln_evidence == pytest.approx(exact, abs=5.0 * found.error)


def test_one_seed_gives_the_same_numbers() -> None:
    first, again, other = (weigh(same_side(), seed=seed).evidences[0] for seed in (3, 3, 4))
    assert first == again
    assert first.ln_evidence != other.ln_evidence


def test_an_unknown_engine_is_refused_with_those_that_there_are() -> None:
    with pytest.raises(InputError, match='write "annealed"'):
        weigh(same_side(), engine="anealed")


# When it is established.


def test_another_engine_has_to_agree_with_an_established_answer() -> None:
    standard = evidence(QUADRATURE, SAMPLING)
    assert joined(standard, drawn(-10.05), "annealed", "").established
    apart = joined(standard, drawn(-10.5), "annealed", "")
    assert not apart.established
    assert apart.reason == "annealing differs from sampling by 0.48"
    assert apart.ln_evidence == -10.5


def test_where_two_estimators_differ_it_has_to_agree_with_one() -> None:
    reason = "quadrature and sampling differ by 0.6"
    standard = evidence(QUADRATURE, replace(SAMPLING, ln_evidence=-10.6), established=False, reason=reason)
    for value, is_established in ((-10.61, True), (-10.05, True), (-11.3, False), (-10.35, False)):
        found = joined(standard, drawn(value), "annealed", reason)
        assert found.established == is_established
        assert (found.reason == "") == is_established
    assert found.reason.startswith(f"{reason}; and annealing differs from quadrature by")


def test_where_no_other_estimator_is_in_order_it_stands_alone() -> None:
    doubtful = replace(SAMPLING, ln_evidence=-12.0, k_hat=0.9)
    assert joined(
        evidence(QUADRATURE, doubtful, established=False, reason="x"), drawn(-11.0), "annealed", "x"
    ).established
    assert joined(evidence(established=False, reason="x"), drawn(-11.0), "annealed", "x").established


@pytest.mark.parametrize(
    ("answer", "word"),
    [
        (drawn(-10.0, 0.2), "above 0.1"),
        (drawn(-10.0, 0.02, "1 of 16 annealed populations found what the others missed"), "missed"),
        (nothing_drawn("annealing", 2, "no draw can produce the observed counts"), "no draw"),
    ],
    ids=["error", "doubt", "nothing"],
)
def test_an_answer_in_doubt_is_not_established(answer: Drawn, word: str) -> None:
    found = joined(evidence(QUADRATURE, SAMPLING, established=False, reason="why"), answer, "annealed", "why")
    assert not found.established
    assert found.reason.startswith("why; and ")
    assert word in found.reason
    assert found.ln_evidence is not None
    assert np.isfinite(found.ln_evidence)


def test_advice_is_left_out_of_the_reason() -> None:
    assert engines._first_part("too many nodes; fix some parameters") == "too many nodes"


def test_agreement_is_that_of_the_standard_pair() -> None:
    first = Estimate("a", 0.0, 0.03)
    assert agree(first, Estimate("b", 0.05 + 0.149, 0.04))
    assert not agree(first, Estimate("b", 0.05 + 0.151, 0.04))
