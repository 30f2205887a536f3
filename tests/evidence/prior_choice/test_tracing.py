"""The traced curve: evidences with the strength held, against brute force that shares nothing with them."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy import integrate, stats

from tests.evidence import brute_force
from tests.evidence.prior_choice.curves import counted
from tests.evidence.small_analyses import TAU, YIELD, counting, source
from workbench.evidence.prior_choice.averages import average
from workbench.evidence.prior_choice.curve import FLOOR, StrengthCurve
from workbench.evidence.prior_choice.reference import first_equal
from workbench.evidence.prior_choice.tracing import trace
from workbench.evidence.weigh import weigh
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.priors import Exponential, Gamma, HalfNormal, LogUniform, Prior, Uniform
from workbench.likelihood.model import compile_model

BOTH = "signal plus background"
SEED = np.random.SeedSequence(3)


def text_of(prior: Prior) -> str:
    return prior.text()


def traced(analysis: Analysis) -> StrengthCurve:
    scale = first_equal(compile_model(analysis, BOTH), "strength")
    return trace(analysis, BOTH, "strength", weigh(analysis).evidences[0], SEED, is_nested=True, scale=scale)


@pytest.mark.parametrize(
    ("observed", "background"), [(0, 2.5), (1, 0.3), (9, 3.8), (14, 20.0), (400, 300.0), (3, 1e-9)]
)
@pytest.mark.parametrize("prior", [Exponential(1.0), Uniform(0.0, 60.0), Uniform(0.0, 0.2)], ids=text_of)
def test_a_count_on_a_known_background_has_the_curve_of_its_formula(
    observed: float, background: float, prior: Prior
) -> None:
    """By hand: ln R = n ln(1 + s y/b) - s y, whatever the declared prior."""
    curve = traced(counting(observed, background, prior))
    formula = counted(observed, background, YIELD)
    assert curve.doubt() == ""
    assert curve.is_ended
    assert curve.ln_ratio == pytest.approx(formula(curve.strengths), abs=1e-8)
    between = np.linspace(0.0, curve.reach, 333)
    matters = formula(between) > -8.0
    assert curve.at(between)[matters] == pytest.approx(formula(between)[matters], abs=0.01)
    assert float(curve.at(np.array(curve.reach))) < FLOOR


def off_and_efficiency() -> Analysis:
    """Return a count with a control region and an uncertain efficiency."""
    return counting(
        11, Gamma(2.0, 0.3), Exponential(1.0), control=15, uncertainties=(source("eff", signal=0.2),)
    )


def by_quadrature(strength: float) -> float:
    """Return R by scipy, both the efficiency and the background integrated over by quad."""

    def joint(signal: float) -> float:
        def over(b: float) -> float:
            return float(
                stats.poisson.pmf(11, b + signal)
                * stats.poisson.pmf(15, TAU * b)
                * stats.gamma.pdf(b, 2.0, scale=1 / 0.3)
            )

        return float(integrate.quad(over, 0.0, 20.0, epsrel=1e-9, points=[2.0, 5.0])[0])

    def over_efficiency(z: float) -> float:
        return float(stats.norm.pdf(z)) * joint(strength * YIELD * 1.2**z)

    return float(integrate.quad(over_efficiency, -8.0, 8.0, epsrel=1e-7, points=[0.0])[0]) / joint(0.0)


@pytest.mark.parametrize("strength", [0.4, 0.7, 2.5])
def test_nuisance_parameters_are_averaged_over(strength: float) -> None:
    curve = traced(off_and_efficiency())
    expected = float(np.log(by_quadrature(strength)))
    found, error = float(curve.at(np.array(strength))), curve.error_at(strength)
    assert 0.0 < error < 0.02
    assert found == pytest.approx(expected, abs=4.0 * error + 1e-3)
    # The negative control: a strength a tenth off is told apart.
    assert abs(float(curve.at(np.array(1.1 * strength))) - expected) > 8.0 * error


@pytest.mark.parametrize(
    "prior",
    [Uniform(0.0, 4.0), HalfNormal(0.8), Gamma(2.0, 1.5), LogUniform(0.02, 5.0)],
    ids=text_of,
)
def test_an_average_over_the_curve_is_the_evidence_with_that_prior_declared(prior: Prior) -> None:
    analysis = off_and_efficiency()
    curve = traced(analysis)
    declared = replace(
        analysis,
        parameters=tuple(replace(p, prior=prior) if p.name == "strength" else p for p in analysis.parameters),
    )
    ends = (0.02, 0.1, 0.3, 0.7, 1.2, 2.0, 3.0, 4.0)
    rules = {
        "strength": brute_force.under(prior, *((0.0, *ends) if prior.support[0] == 0.0 else (*ends, 5.0))),
        "level": brute_force.under(Gamma(2.0, 0.3), 0.0, 1.0, 3.0, 5.0, 8.0, 14.0),
        "eff": brute_force.standard_normal(),
    }
    null = {"level": rules["level"]}
    model, background = compile_model(declared, BOTH), compile_model(declared, "background only")
    expected = brute_force.ln_evidence(model, rules) - brute_force.ln_evidence(background, null)
    found = average(curve, prior)
    assert found.ln_bayes_factor is not None
    assert found.error is not None
    assert found.ln_bayes_factor == pytest.approx(expected, abs=4.0 * found.error + 2e-3)


def test_a_prior_that_never_reached_the_best_strength_is_no_hindrance() -> None:
    """A declared range of 0 to 0.2 with a best strength of 17: the curve goes on to where R ends."""
    curve = traced(counting(105, 3.0, Uniform(0.0, 0.2)))
    assert curve.reach > 20.0
    assert curve.strengths[int(np.argmax(curve.ln_ratio))] == pytest.approx(17.0, abs=0.3)


def test_a_node_that_is_not_established_is_told_where_it_matters() -> None:
    curve = traced(counting(9, 3.8, Exponential(1.0)))
    best, last = int(np.argmax(curve.ln_ratio)), len(curve.reasons) - 1

    def without(place: int) -> StrengthCurve:
        established = np.arange(len(curve.reasons)) != place
        reasons = tuple(
            "its draws are too uneven" if one == place else "" for one in range(len(curve.reasons))
        )
        return replace(curve, established=established, reasons=reasons)

    assert "its draws are too uneven" in without(best).doubt()
    assert without(last).doubt() == ""
