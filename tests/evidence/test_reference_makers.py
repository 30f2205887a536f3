"""The slow references themselves: independent of the engine, held against closed forms and each other."""

from __future__ import annotations

import ast

import numpy as np
import pytest
from scipy import stats

from tests.evidence.references import saved
from tests.evidence.references.cases import KINDS, TOTAL, case
from tests.evidence.references.direct import Direct, ln_probability
from tests.evidence.references.importance import sampled
from tests.evidence.references.making import reference
from tests.evidence.small_analyses import counting
from workbench.hypotheses.priors import Exponential, Gamma

# What a reference may know of the package: what is declared, and how a file is written whole.
DECLARED = ("workbench.hypotheses.", "workbench.counts.")
COMPUTED = ("workbench.hypotheses.jets", "workbench.hypotheses.splines")


@pytest.mark.parametrize("name", saved.SCRIPT)
def test_references_share_nothing_with_what_they_check(name: str) -> None:
    tree = ast.parse((saved.HERE / f"{name}.py").read_text(encoding="utf-8"))
    modules = [node.module or "" for node in ast.walk(tree) if isinstance(node, ast.ImportFrom)]
    modules += [alias.name for node in ast.walk(tree) if isinstance(node, ast.Import) for alias in node.names]
    ours = [module for module in modules if module.startswith("workbench")]
    assert all(module.startswith(DECLARED) for module in ours)
    assert not any(module.startswith(COMPUTED) for module in ours)


def test_a_gamma_background_gives_the_negative_binomial() -> None:
    """Source: scipy.stats.nbinom, the Poisson law averaged over a gamma prior."""
    analysis = counting(7, Gamma(shape=3.0, rate=0.5), Exponential(1.0), control=20)
    found = reference(Direct(analysis, "background only"), 1)
    # With control exposure 4: the same level behind both counts.
    first = stats.nbinom.logpmf(20, 3.0, 0.5 / (0.5 + 4.0))
    then = stats.nbinom.logpmf(7, 23.0, 4.5 / (4.5 + 1.0))
    assert found.ln_evidence == pytest.approx(first + then, abs=1e-7)


def test_sampling_finds_the_negative_binomial_within_its_error() -> None:
    analysis = counting(7, Gamma(shape=3.0, rate=0.5), Exponential(1.0), control=20)
    right = stats.nbinom.logpmf(20, 3.0, 0.5 / 4.5) + stats.nbinom.logpmf(7, 23.0, 4.5 / 5.5)
    direct = Direct(analysis, "background only")
    pulls = []
    for seed in range(8):
        found = sampled(direct.ln_likelihood, 1, seed, 1.0, 2**15)
        pulls.append((found.ln_evidence - right) / found.error)
    assert 8 * np.mean(np.square(pulls)) < stats.chi2.isf(1e-4, 8)


def test_the_law_of_a_small_simulation_is_the_negative_binomial() -> None:
    """Source: scipy.stats.nbinom with n = T^2/V and mean T."""
    counts, expected, variance = (
        np.array([0.0, 3.0, 11.0]),
        np.array([2.0, 2.5, 7.0]),
        np.array([1.0, 0.3, 9.0]),
    )
    shape = expected**2 / variance
    right = stats.nbinom.logpmf(counts, shape, shape / (shape + expected))
    assert ln_probability(counts, expected, variance) == pytest.approx(right, abs=1e-12)


@pytest.mark.slow
@pytest.mark.parametrize("number", [3, 7, 11, 19])
def test_quadrature_and_sampling_agree_in_two_dimensions(number: int) -> None:
    one = case(number)
    direct = Direct(one.analysis, "background only")
    assert direct.size == 2
    exact = reference(direct, 1)
    drawn = reference(direct, 1, wanted=1e-3, drawn=True)
    assert exact.method != drawn.method
    assert exact.error <= 1e-6
    assert abs(drawn.ln_evidence - exact.ln_evidence) < 4.0 * np.hypot(drawn.error, exact.error)


def test_the_random_analyses_reach_as_far_as_is_said() -> None:
    cases = [case(number) for number in range(TOTAL)]
    assert {sum(one.kind == kind for one in cases) for kind in {one.kind for one in cases}} == {
        TOTAL // len(KINDS)
    }
    directs = [Direct(one.analysis, one.analysis.hypotheses[-1].name) for one in cases]
    sizes, bins = [one.size for one in directs], [one.bins for one in directs]
    assert (min(sizes), max(sizes)) == (0, 30)
    assert min(bins) == 1
    assert 150 < max(bins) <= 250
    regions = [region for one in cases for region in one.analysis.regions]
    counts = [float(np.sum(region.table.observed)) for region in regions if region.table.observed is not None]
    assert min(counts) == 0.0
    assert max(counts) > 1e5
    families = {type(p.prior).__name__ for one in cases for p in one.analysis.parameters}
    assert len(families) == 9
    assert sum(len(one.analysis.regions) > 1 for one in cases) > 40
