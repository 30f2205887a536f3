"""Integrals on which evidences break: needles in wide ranges, a width beside a mass, shapes alike.

The references are sums over dense grids of a likelihood that is written out here, with scipy's distribution
functions; nothing of the engine takes part but where `brute_force` is named.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import numpy.typing as npt
import pytest
from scipy import special, stats

from tests.analyses import background, region_of, signal
from tests.evidence.brute_force import ln_evidence, panels, standard_normal, under
from tests.evidence.small_analyses import bump, several_bins, templates
from workbench.evidence.results import Weighing
from workbench.evidence.weigh import weigh
from workbench.hypotheses.analysis import Analysis, Parameter
from workbench.hypotheses.priors import Exponential, LogUniform, Normal, Uniform
from workbench.hypotheses.processes import Contribution
from workbench.hypotheses.shapes import Flat, Gaussian
from workbench.hypotheses.uncertainties import Effect, Uncertainty
from workbench.likelihood.model import compile_model

Array = npt.NDArray[np.float64]

LOW, HIGH, BINS, EVENTS, YIELD = 20.0, 80.0, 400, 4000.0, 20.0
RESOLUTION = (HIGH - LOW) / 800.0
EDGES = np.linspace(LOW, HIGH, BINS + 1)
MOST = 5.0


def needle(counts: Array) -> Analysis:
    """A line of 1/800 of the range, its mass anywhere, on a flat background that is known."""
    return Analysis(
        "Needle",
        (region_of(EDGES, counts),),
        (Parameter("strength", Uniform(0.0, MOST)), Parameter("mass", Uniform(LOW, HIGH))),
        (
            background("flat", Flat(), EVENTS),
            signal("line", Gaussian("mass", RESOLUTION), YIELD, "strength"),
        ),
    )


def counts_with(*lines: tuple[float, float], seed: int = 1) -> Array:
    """Return pseudo-data: the background, and lines of some events at some masses."""
    expected = np.full(BINS, EVENTS / BINS)
    for mass, events in lines:
        expected = expected + events * np.diff(stats.norm(mass, RESOLUTION).cdf(EDGES))
    return np.random.default_rng(seed).poisson(expected).astype(float)


def ln_ratio_by_grid(counts: Array, masses_a_resolution: float) -> float:
    """Return ln of the average over mass and strength of p(n | b + s)/p(n | b), on midpoints of mass."""
    number = int(800 * masses_a_resolution)
    masses = LOW + (np.arange(number) + 0.5) * (HIGH - LOW) / number
    strengths, weights = panels(0.0, 0.5, 1.5, 3.0, MOST, nodes=24)
    found = np.empty(number)
    for place, mass in enumerate(masses):
        window = slice(*np.searchsorted(EDGES, [mass - 9.0 * RESOLUTION, mass + 9.0 * RESOLUTION]))
        first, last = max(window.start - 1, 0), min(window.stop + 1, BINS)
        line = YIELD * np.diff(special.ndtr((EDGES[first : last + 1] - mass) / RESOLUTION))
        events = strengths[:, None] * line
        ln_ratio = special.xlog1py(counts[first:last], events / (EVENTS / BINS)).sum(axis=1)
        found[place] = (np.exp(ln_ratio - events.sum(axis=1)) * weights).sum() / MOST
    return float(np.log(found.mean()))


def found_ln_ratio(weighing: Weighing) -> tuple[float, float, float]:
    """Return ln B, its error, and the quadrature's ln B."""
    known, line = weighing.evidences
    assert line.established, line.reason
    assert line.error is not None
    assert line.ln_evidence is not None
    assert known.ln_evidence is not None
    quadrature = next(one for one in line.estimates if one.name == "quadrature")
    return line.ln_evidence - known.ln_evidence, line.error, quadrature.ln_evidence - known.ln_evidence


LINES = {
    "nothing": (),
    "a line": ((44.0, 40.0),),
    "a line at the edge": ((20.03, 40.0),),
    "a line across a bin's edge": ((EDGES[100], 30.0),),
    "three lines": ((25.0, 25.0), (44.4, 30.0), (71.7, 28.0)),
}


@pytest.mark.parametrize("name", list(LINES))
def test_a_needle_is_found_wherever_it_lies(name: str) -> None:
    counts = counts_with(*LINES[name])
    exact = ln_ratio_by_grid(counts, 12.0)
    found, error, quadrature = found_ln_ratio(weigh(needle(counts)))
    assert abs(found - exact) < 3.5 * error
    assert quadrature == pytest.approx(exact, abs=0.03)


def test_too_few_masses_would_be_seen() -> None:
    """The same sum on one mass in two resolutions is off by far more than what is allowed above."""
    counts = counts_with(*LINES["a line"])
    assert abs(ln_ratio_by_grid(counts, 0.5) - ln_ratio_by_grid(counts, 12.0)) > 0.1


def test_a_peak_five_deviations_out_in_the_prior_of_its_mass_is_not_missed() -> None:
    """By brute force to seven deviations; up to four there is less than half of it."""
    edges = np.linspace(0.0, 20.0, 41)
    expected = 400.0 * -np.diff(np.exp(-edges / 8.0)) / -np.expm1(-20.0 / 8.0)
    expected = expected + 55.0 * np.diff(stats.norm(6.0, 0.4).cdf(edges))
    prior = Normal(14.0, 1.6)
    analysis = bump(np.round(expected), strength=Uniform(0.0, 10.0), mass=prior)
    model = compile_model(analysis, "signal plus background")
    strengths = under(Uniform(0.0, 10.0), 0.0, 1.0, 2.5, 5.0, 10.0, nodes=16)

    def to(deviations: float) -> float:
        ends = np.linspace(14.0 - 1.6 * deviations, 14.0 + 1.6 * deviations, 61)
        return ln_evidence(model, {"strength": strengths, "mass": under(prior, *ends, nodes=6)})

    evidence = weigh(analysis).evidences[1]
    assert evidence.established, evidence.reason
    assert evidence.error is not None
    assert evidence.ln_evidence is not None
    assert abs(evidence.ln_evidence - to(7.0)) < 3.5 * evidence.error
    assert to(4.0) < to(7.0) - np.log(2.0)


def with_width(counts: Array) -> Analysis:
    analysis = bump(counts)
    peak = analysis.processes[1]
    wider = replace(peak, regions={"spectrum": Contribution(Gaussian("mass", "width"), 12.0)})
    return replace(
        analysis,
        parameters=(*analysis.parameters, Parameter("width", LogUniform(0.2, 2.0))),
        processes=(analysis.processes[0], wider),
    )


@pytest.mark.parametrize(("mass", "width"), [(6.0, 0.25), (11.0, 0.8), (2.0, 1.5), (None, 1.0)], ids=str)
def test_a_width_beside_a_mass_is_the_sum_over_both(mass: float | None, width: float) -> None:
    """By brute force over 190 masses, 48 widths and 60 strengths, on 40 bins."""
    edges = np.linspace(0.0, 20.0, 41)
    expected = 400.0 * -np.diff(np.exp(-edges / 8.0)) / -np.expm1(-20.0 / 8.0)
    if mass is not None:
        expected = expected + 24.0 * np.diff(stats.norm(mass, width).cdf(edges))
    analysis = with_width(np.random.default_rng(8).poisson(expected).astype(float))
    model = compile_model(analysis, "signal plus background")
    rules = {
        "strength": under(Uniform(0.0, 5.0), 0.0, 1.0, 2.5, 5.0, nodes=16),
        "mass": under(Uniform(1.0, 19.0), *np.linspace(1.0, 19.0, 20), nodes=10),
        "width": under(LogUniform(0.2, 2.0), 0.2, 0.4, 0.8, 2.0, nodes=12),
    }
    exact = ln_evidence(model, rules)
    evidence = weigh(analysis).evidences[1]
    assert evidence.established, evidence.reason
    assert evidence.error is not None
    assert evidence.ln_evidence is not None
    assert abs(evidence.ln_evidence - exact) < 3.5 * evidence.error
    narrower = {**rules, "width": under(LogUniform(0.2, 0.21), 0.2, 0.21, nodes=12)}
    assert abs(ln_evidence(model, narrower) - exact) > 5.0 * evidence.error


@pytest.mark.parametrize("size", [0.1, 0.5])
def test_a_source_that_looks_like_the_signal_is_integrated_with_it(size: float) -> None:
    """A source moves the background just as the signal adds to it: the counts tell only their sum."""
    columns = {
        "background": [30.0, 30.0, 30.0],
        "signal": [0.0, 30.0, 0.0],
        "bump up": [30.0, 30.0 * (1.0 + size), 30.0],
        "bump down": [30.0, 30.0 / (1.0 + size), 30.0],
    }
    alike = Uncertainty("bump", (Effect("background", "bump up", "bump down"),))
    analysis = templates(several_bins("r", [31.0, 44.0, 28.0], columns), Exponential(0.5), (alike,))
    model = compile_model(analysis, "signal plus background")
    rules = {"strength": under(Exponential(0.5), *np.linspace(0.0, 8.0, 9)), "bump": standard_normal(24)}
    evidence = weigh(analysis).evidences[1]
    assert evidence.established, evidence.reason
    assert evidence.error is not None
    assert evidence.ln_evidence == pytest.approx(ln_evidence(model, rules), abs=3.5 * evidence.error)
