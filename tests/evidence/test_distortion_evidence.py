"""The evidence of a distorted background, against sums apart from the engine; and its cautions."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import numpy.typing as npt
import pytest
from scipy import special, stats

import workbench as wb
from tests.analyses import background, region_of, signal
from workbench.evidence.mis_modelling import mis_modelling_cautions
from workbench.evidence.results import Posterior
from workbench.hypotheses.shapes import Template

Array = npt.NDArray[np.float64]

EVENTS = np.array([40.0, 30.0, 20.0, 10.0])
BUMP = np.array([0.0, 2.0, 6.0, 2.0])
OBSERVED = np.array([38.0, 33.0, 27.0, 13.0])


def four_bins(distortion: wb.Distortion | None, observed: Array = OBSERVED) -> wb.Analysis:
    """Return four bins with a known background, a bump, and the background distorted."""
    return wb.Analysis(
        "Four bins",
        (region_of([0.0, 1, 2, 3, 4], observed, {"b": EVENTS, "s": BUMP}),),
        (wb.Parameter("strength", wb.Uniform(0.0, 4.0)),),
        (background("known", Template("b")), signal("bump", Template("s"), None, "strength")),
        hypotheses=(
            wb.Hypothesis("background only", ("known",)),
            wb.Hypothesis("bump", ("known", "bump")),
            wb.Hypothesis("neither", ("known",), distortion=distortion),
        ),
    )


def summed(size: float, terms: int, strengths: Array) -> float:
    """Return the ln evidence by a plain product of sums, the functions written out for shares 0.4 to 1.

    Means of Legendre polynomials over [0, 0.4, 0.7, 0.9, 1] from their antiderivatives by numpy's
    polynomials; the likelihood by scipy.stats.
    """
    ends = 2.0 * np.array([0.0, 0.4, 0.7, 0.9, 1.0]) - 1.0
    functions = []
    for degree in range(terms):
        whole = np.polynomial.Legendre.basis(degree).integ()
        functions.append(np.sqrt(2 * degree + 1) * np.diff(whole(ends)) / np.diff(ends))
    x, w = np.polynomial.hermite_e.hermegauss(48)
    mesh = np.stack([part.ravel() for part in np.meshgrid(*[x] * terms)], axis=1)
    weight = np.prod(np.stack([part.ravel() for part in np.meshgrid(*[w] * terms)], axis=1), axis=1)
    factor = (1.0 + size) ** (mesh @ np.array(functions))
    logs = [stats.poisson.logpmf(OBSERVED, EVENTS * factor + s * BUMP).sum(axis=1) for s in strengths]
    mean = special.logsumexp(np.array(logs), axis=0) - np.log(len(strengths))
    return float(special.logsumexp(mean, b=weight / weight.sum()))


@pytest.mark.parametrize(("size", "terms"), [(0.3, 1), (0.1, 2), (0.2, 3)])
def test_the_evidence_of_neither_is_the_sum_over_its_terms(size: float, terms: int) -> None:
    weighing = wb.weigh(four_bins(wb.Distortion(size, terms)))
    found = weighing.evidences[2]
    assert found.established
    assert found.ln_evidence == pytest.approx(summed(size, terms, np.zeros(1)), abs=5.0 * (found.error or 0))
    undistorted = summed(1e-12, 1, np.zeros(1))
    assert weighing.evidences[0].ln_evidence == pytest.approx(undistorted, abs=1e-9)
    assert abs(undistorted - (found.ln_evidence or 0.0)) > 10.0 * (found.error or 0.0)  # the test can fail


def test_a_signal_on_a_distorted_background_is_the_sum_over_both() -> None:
    analysis = four_bins(None)
    both = replace(analysis.hypotheses[1], distortion=wb.Distortion(0.1, 2))
    found = wb.weigh(replace(analysis, hypotheses=(analysis.hypotheses[0], both))).evidences[1]
    middles = np.asarray(4.0 * (np.arange(400) + 0.5) / 400.0, dtype=np.float64)
    assert found.established
    assert found.ln_evidence == pytest.approx(summed(0.1, 2, middles), abs=5.0 * (found.error or 0.0))


def test_half_and_twice_the_size_are_what_those_sizes_give() -> None:
    """Half and twice mean the ln of one step up; each is then summed for itself."""
    (_, comparison) = wb.weigh(four_bins(wb.Distortion(0.2, 3))).comparisons
    (scaled,) = comparison.sensitivity
    nothing = summed(1e-12, 1, np.zeros(1))
    for found, factor in ((scaled.halved, 0.5), (scaled.doubled, 2.0)):
        size = float(np.exp(factor * np.log(1.2))) - 1.0
        assert found == pytest.approx(summed(size, 3, np.zeros(1)) - nothing, abs=0.02)


@pytest.mark.parametrize(
    ("shares", "codes"),
    [
        ((0.2, 0.75, 0.05), []),
        ((0.2, 0.6, 0.2), ["distortion-shares"]),
        ((0.1, 0.3, 0.6), ["distortion-wins"]),
        ((None, None, None), []),
    ],
)
def test_neither_is_spoken_of_when_it_keeps_a_good_share(
    shares: tuple[float | None, ...], codes: list[str]
) -> None:
    analysis = four_bins(wb.Distortion(0.1, 2))
    names = [hypothesis.name for hypothesis in analysis.hypotheses]
    posteriors = [Posterior(name, 1 / 3, share, 0.0) for name, share in zip(names, shares, strict=True)]
    assert [one.code for one in mis_modelling_cautions(analysis, posteriors)] == codes


def test_a_signal_with_a_distortion_is_no_neither() -> None:
    analysis = four_bins(wb.Distortion(0.1, 2))
    turned = tuple(
        replace(one, distortion=wb.Distortion(0.1, 2) if one.name == "bump" else None)
        for one in analysis.hypotheses
    )
    posteriors = [Posterior(one.name, 1 / 3, 1 / 3, 0.0) for one in turned]
    assert list(mis_modelling_cautions(replace(analysis, hypotheses=turned), posteriors)) == []
