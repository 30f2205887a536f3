"""Results built by hand, for what turns results into text, records and pictures; none was computed."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from workbench.counts.binning import Binning
from workbench.counts.region import Region
from workbench.counts.table import Table
from workbench.ensembles.predictive import PriorPredictive
from workbench.ensembles.results import Adequacy
from workbench.errors import Caution
from workbench.evidence.results import Comparison, Estimate, Evidence, Posterior, ScaledPrior, Weighing
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.exposure import Exposure
from workbench.hypotheses.hypothesis import Hypothesis
from workbench.hypotheses.parameters import Parameter
from workbench.hypotheses.priors import Normal, Uniform
from workbench.hypotheses.processes import Contribution, Process
from workbench.hypotheses.shapes import Falling, Gaussian, Template
from workbench.hypotheses.uncertainties import Effect, Uncertainty
from workbench.likelihood.results import Array, Ending, Fit, Fitted
from workbench.records.outcomes import CheckOutcome, FitOutcome, Origin, WeighOutcome

ORIGIN = Origin("tern.toml", "sha256:" + "0" * 64, 1, {"pseudo_experiments": 2000})
BACKGROUND, RESONANCE = "background only", "resonance"
EDGES = np.linspace(20.0, 80.0, 13)
CONTINUUM = 300.0 * np.diff(-np.exp(-(EDGES - 20.0) / 18.0)) / (1.0 - np.exp(-60.0 / 18.0))
FAKES = np.full(12, 1.5)
PEAK = np.array([0, 0, 0, 0, 1.2, 9.1, 8.9, 1.1, 0, 0, 0, 0])
OBSERVED = np.array([79.0, 61, 42, 36, 28, 29, 27, 12, 8, 1, 4, 0])


def analysis(title: str = "Narrow resonance at Tern") -> Analysis:
    """Return an analysis with one region, three processes, three kinds of uncertainty."""
    columns = {"fakes": FAKES, "fakes hard": 1.1 * FAKES, "fakes soft": 0.9 * FAKES, "spare": FAKES}
    table = Table(Binning(EDGES[:-1], EDGES[1:]), OBSERVED, columns, source="tern.csv")
    return Analysis(
        title,
        (Region("peak", table, "dimuon mass", "GeV"),),
        (
            Parameter("strength", Uniform(0.0, 5.0)),
            Parameter("mass", Uniform(25.0, 75.0), "GeV"),
            Parameter("continuum scale", Normal(18.0, 0.5), "GeV"),
        ),
        (
            Process("continuum", "background", {"peak": Contribution(Falling("continuum scale"), 300.0)}),
            Process("fakes", "background", {"peak": Contribution(Template("fakes"))}),
            Process(
                "resonance", "signal", {"peak": Contribution(Gaussian("mass", 3.0), 20.0)}, ("strength",)
            ),
        ),
        (
            Uncertainty("continuum normalisation", (Effect("continuum", 0.1),)),
            Uncertainty("muon efficiency", (Effect("continuum", 0.02), Effect("resonance", 0.03, -0.04))),
            Uncertainty("fake composition", (Effect("fakes", "fakes hard", "fakes soft"),)),
        ),
        (
            Hypothesis(BACKGROUND, ("continuum", "fakes"), 10.0),
            Hypothesis(RESONANCE, ("continuum", "fakes", "resonance"), 1.0),
        ),
        Exposure(24.0, "fb^-1", 0.02),
    )


def fits() -> tuple[Fit, Fit]:
    """Return a fit of each hypothesis."""
    sources = (
        Fitted("continuum scale", "GeV", "nuisance", 18.31, 0.42, -0.41, 0.43, 0.62, 0.29, False),
        Fitted("continuum normalisation", "", "source", -0.34, 0.51, -0.52, 0.5, -0.34, 0.74, False),
        Fitted("muon efficiency", "", "source", 0.02, 0.99, -0.99, 0.99, 0.02, 0.02, False),
        Fitted("fake composition", "", "source", 0.0, 1.0, -1.0, 1.0, 0.0, 0.0, False),
        Fitted("exposure", "", "source", -0.05, 0.98, -0.98, 0.98, -0.05, 0.04, False),
    )
    signal = (
        Fitted("strength", "", "signal", 1.02, 0.31, -0.28, 0.34, None, None, False),
        Fitted("mass", "GeV", "signal", 50.04, 0.61, None, 0.63, None, None, False),
    )
    first = np.eye(5)
    first[0, 1] = first[1, 0] = -0.62
    second = np.eye(7)
    second[0, 3] = second[3, 0] = -0.27
    second[2, 3] = second[3, 2] = -0.58
    background = {"continuum": 1.02 * CONTINUUM, "fakes": FAKES}
    with_peak = {"continuum": 0.97 * CONTINUUM, "fakes": FAKES, "resonance": PEAK}
    return (
        Fit(BACKGROUND, Ending.CONVERGED, -38.512, -38.61, sources, first, sum_of(background), background),
        Fit(
            RESONANCE,
            Ending.CONVERGED,
            -29.107,
            -29.3,
            (*signal, *sources),
            second,
            sum_of(with_peak),
            with_peak,
            ("The data say nothing about fake composition: its error is that of its prior.",),
        ),
    )


def sum_of(parts: dict[str, Array]) -> Array:
    """Return the sum over processes."""
    return np.asarray(np.sum(list(parts.values()), axis=0))


def adequacies(background: float = 0.14, resonance: float = 0.46) -> tuple[Adequacy, Adequacy]:
    """Return the adequacy of each hypothesis."""
    return (
        Adequacy(BACKGROUND, 21.4, background, max(0.1 * background, 0.0007), 200, 0),
        Adequacy(RESONANCE, 11.9, resonance, 0.035, 200, 2),
    )


def weighing(ln_bayes_factor: float = 7.715, prior_odds: float = 0.1) -> Weighing:
    """Return an established weighing with some ln B."""
    error, ln_first = 0.005, -43.29
    ln_second = ln_first + ln_bayes_factor
    ln_odds = ln_bayes_factor + np.log(prior_odds)
    second = float(1.0 / (1.0 + np.exp(-ln_odds)))
    first = float(1.0 / (1.0 + np.exp(min(ln_odds, 700.0))))
    odds = float(np.exp(ln_odds)) if ln_odds < 700.0 else float("inf")
    prior = prior_odds / (1.0 + prior_odds)
    comparison = Comparison(
        RESONANCE,
        BACKGROUND,
        ln_bayes_factor,
        error,
        prior_odds,
        odds,
        odds * error,
        True,
        (ScaledPrior("strength", "uniform from 0 to 5", ln_bayes_factor + 0.68, ln_bayes_factor - 0.69),),
    )
    return Weighing(
        (
            _evidence(BACKGROUND, ln_first, 0.003, 0.11),
            _evidence(RESONANCE, ln_second, 0.004, 0.24),
        ),
        (
            Posterior(BACKGROUND, 1.0 - prior, first, error * first * second),
            Posterior(RESONANCE, prior, second, error * first * second),
        ),
        (comparison,),
        1,
        (
            Caution(
                "template-errors", "The table has error columns, which template_errors = false leaves out."
            ),
        ),
    )


def unestablished() -> Weighing:
    """Return a weighing whose second evidence is not established."""
    given = weighing()
    reason = "k-hat is 0.83, above 0.70, so the sampling misses part of the integral"
    evidence = replace(given.evidences[1], established=False, reason=reason)
    posteriors = tuple(replace(item, probability=None, error=None) for item in given.posteriors)
    comparison = replace(
        given.comparisons[0], posterior_odds=None, posterior_odds_error=None, established=False
    )
    return replace(
        given, evidences=(given.evidences[0], evidence), posteriors=posteriors, comparisons=(comparison,)
    )


def annealed() -> Weighing:
    """Return a weighing whose second evidence needed another engine, and one alternative of its first too."""
    given = weighing()
    first, second = given.evidences
    reason = "quadrature and sampling differ by 0.41, more than 0.12"
    estimate = Estimate("annealing", second.ln_evidence or 0.0, 0.021, None, 1_245_184)
    other = replace(
        second,
        error=0.021,
        estimates=(replace(second.estimates[0], ln_evidence=-35.985), second.estimates[1], estimate),
        engine="annealed",
        engine_reason=reason,
    )
    comparison = replace(given.comparisons[0], ln_bayes_factor_error=0.021)
    return replace(given, evidences=(first, other), comparisons=(comparison,))


def weighed(given: Weighing | None = None, judged: tuple[Adequacy, ...] | None = None) -> WeighOutcome:
    """Return what `weigh` would hand over."""
    return WeighOutcome(analysis(), ORIGIN, given or weighing(), judged or adequacies(), fits())


def checked(judged: tuple[Adequacy, ...] | None = None) -> CheckOutcome:
    """Return what `check` would hand over."""
    nothing = np.zeros(12)
    predictives = (
        PriorPredictive(BACKGROUND, nothing, nothing, nothing, 286.0, 318.0, 352.0),
        PriorPredictive(RESONANCE, nothing, nothing, nothing, 311.0, 366.0, 422.0),
    )
    return CheckOutcome(analysis(), ORIGIN, predictives, adequacies() if judged is None else judged)


def fitted() -> FitOutcome:
    """Return what `fit` would hand over."""
    return FitOutcome(analysis(), replace(ORIGIN, seed=None), fits())


def _evidence(name: str, ln_evidence: float, error: float, k_hat: float) -> Evidence:
    return Evidence(
        name,
        ln_evidence,
        error,
        True,
        "",
        (
            Estimate("quadrature", ln_evidence - 0.002, 0.003, None, 512),
            Estimate("sampling", ln_evidence, error, k_hat, 4096),
        ),
    )
