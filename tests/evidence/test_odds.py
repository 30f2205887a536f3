"""From evidences to odds and probabilities, with their numerical errors, worked by hand."""

from __future__ import annotations

from dataclasses import fields
from typing import Any

import numpy as np
import numpy.typing as npt
import pytest

from tests.evidence.small_analyses import counting, source
from workbench.evidence.odds import compare, posteriors
from workbench.evidence.results import Evidence
from workbench.evidence.weigh import weigh
from workbench.hypotheses.priors import Exponential

Array = npt.NDArray[np.float64]


def evidence(
    name: str, value: float | None, error: float | None = 0.0, *, established: bool = True
) -> Evidence:
    return Evidence(name, value, error, established, "" if established else "a reason", ())


def test_two_equally_probable_hypotheses_by_hand() -> None:
    """B = e^(ln 4) = 4: odds 4, probabilities 1/5 and 4/5; errors 0.3, 0.4: 0.5 in ln B, 2 in the odds.

    Of the probability: P (1 - P) x 0.5 = 0.08.
    """
    background, signal = evidence("b", -10.0, 0.3), evidence("s", -10.0 + np.log(4.0), 0.4)
    found = compare(signal, background, 1.0)
    assert (found.hypothesis, found.against, found.established) == ("s", "b", True)
    assert found.ln_bayes_factor == pytest.approx(np.log(4.0), rel=1e-14)
    assert found.ln_bayes_factor_error == pytest.approx(0.5, rel=1e-14)
    assert found.posterior_odds == pytest.approx(4.0, rel=1e-13)
    assert found.posterior_odds_error == pytest.approx(2.0, rel=1e-13)
    both = posteriors((background, signal), np.array([0.5, 0.5]))
    assert [one.probability for one in both] == pytest.approx([0.2, 0.8], rel=1e-13)
    assert [one.error for one in both] == pytest.approx([0.08, 0.08], rel=1e-13)


def test_unequal_priors_multiply_the_odds() -> None:
    """Prior odds 1/9 and B = 18: posterior odds 2."""
    background, signal = evidence("b", -3.0), evidence("s", -3.0 + np.log(18.0), 0.01)
    found = compare(signal, background, 1.0 / 9.0)
    assert found.posterior_odds == pytest.approx(2.0, rel=1e-13)
    assert found.posterior_odds_error == pytest.approx(0.02, rel=1e-13)
    assert found.prior_odds == 1.0 / 9.0
    both = posteriors((background, signal), np.array([0.9, 0.1]))
    assert [one.probability for one in both] == pytest.approx([1.0 / 3.0, 2.0 / 3.0], rel=1e-13)
    assert [one.prior for one in both] == [0.9, 0.1]


def test_three_hypotheses_by_hand() -> None:
    """p Z = 0.5 x 2, 0.3 x 5, 0.2 x 12.5 = 1, 1.5, 2.5: P = 0.2, 0.3, 0.5.

    Error of the first, e = 0.1, 0.2, 0.3: 0.2 sqrt(0.8^2 0.01 + 0.3^2 0.04 + 0.5^2 0.09) = 0.2 sqrt(0.0325).
    """
    given = (("a", 2.0, 0.1), ("b", 5.0, 0.2), ("c", 12.5, 0.3))
    three = tuple(evidence(name, float(np.log(z)), error) for name, z, error in given)
    found = posteriors(three, np.array([0.5, 0.3, 0.2]))
    assert [one.probability for one in found] == pytest.approx([0.2, 0.3, 0.5], rel=1e-13)
    assert found[0].error == pytest.approx(0.2 * np.sqrt(0.0325), rel=1e-12)
    assert found[2].error == pytest.approx(0.5 * np.sqrt(0.04 * 0.01 + 0.09 * 0.04 + 0.25 * 0.09), rel=1e-12)


def test_errors_of_probabilities_are_those_of_redrawn_evidences() -> None:
    """An independent route: the spread of probabilities whose ln evidences are drawn within their errors."""
    values, errors, priors = (
        np.array([-5.0, -4.2, -6.0]),
        np.array([0.01, 0.02, 0.015]),
        np.array([0.6, 0.3, 0.1]),
    )
    drawn = values + errors * np.random.default_rng(9).standard_normal((20_000, 3))
    weight = priors * np.exp(drawn)
    spread = (weight / weight.sum(axis=1, keepdims=True)).std(axis=0)
    given = tuple(evidence(n, float(v), float(e)) for n, v, e in zip("abc", values, errors, strict=True))
    found = [one.error for one in posteriors(given, priors)]
    # 20,000 draws give a standard deviation to half a percent.
    assert found == pytest.approx(spread, rel=0.025)
    # The negative control: errors taken one by one, as if the others were known.
    alone = [
        one.probability * e
        for one, e in zip(posteriors(given, priors), errors, strict=True)
        if one.probability
    ]
    assert not np.allclose(alone, spread, rtol=0.025)


def test_what_is_not_established_has_no_odds_but_keeps_its_bayes_factor() -> None:
    background, signal = evidence("b", -3.0, 0.01), evidence("s", -1.0, 0.4, established=False)
    found = compare(signal, background, 1.0)
    assert found.ln_bayes_factor == pytest.approx(2.0)
    assert (found.posterior_odds, found.posterior_odds_error, found.established) == (None, None, False)
    both = posteriors((background, signal), np.array([0.5, 0.5]))
    assert [(one.probability, one.error) for one in both] == [(None, None)] * 2
    assert [one.prior for one in both] == [0.5, 0.5]


def test_a_missing_evidence_leaves_nothing_but_the_prior_odds() -> None:
    found = compare(evidence("s", None, None, established=False), evidence("b", -3.0), 0.25)
    assert found.prior_odds == 0.25
    assert [found.ln_bayes_factor, found.ln_bayes_factor_error, found.posterior_odds] == [None, None, None]


def test_one_doubtful_hypothesis_does_not_take_the_odds_of_two_others() -> None:
    """Each comparison needs its own two evidences only."""
    a, b = evidence("a", -3.0), evidence("b", -2.0)
    assert compare(b, a, 1.0).posterior_odds == pytest.approx(np.e)


@pytest.mark.parametrize("ln_bayes_factor", [-5000.0, -800.0, 800.0, 5000.0])
def test_enormous_odds_are_no_infinity(ln_bayes_factor: float) -> None:
    signal, background = evidence("s", ln_bayes_factor, 0.01), evidence("b", 0.0)
    found = compare(signal, background, 1.0)
    assert found.ln_bayes_factor == ln_bayes_factor
    assert found.posterior_odds is None or np.isfinite(found.posterior_odds)
    both = [one.probability for one in posteriors((background, signal), np.array([0.5, 0.5]))]
    assert both == pytest.approx([0.0, 1.0] if ln_bayes_factor > 0.0 else [1.0, 0.0], abs=1e-300)


def test_results_hold_plain_numbers() -> None:
    """A numpy number would print as np.float64(1.0) and not be told apart from a float until then."""
    weighing = weigh(
        counting(7, 3.0, Exponential(1.0), uncertainties=(source("size", background=0.1),)),
        closed_forms=False,
    )
    nouns: list[Any] = [
        *weighing.evidences,
        *(estimate for one in weighing.evidences for estimate in one.estimates),
        *weighing.posteriors,
        *weighing.comparisons,
        *(one for comparison in weighing.comparisons for one in comparison.sensitivity),
    ]
    for noun in nouns:
        for field in fields(noun):
            kind = type(getattr(noun, field.name))
            assert kind.__module__ == "builtins", (noun, field.name, kind)
