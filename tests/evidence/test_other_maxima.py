"""Maxima on the other side of a source that turns back."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import integrate, stats

from tests.evidence.small_analyses import one_bin, source, templates
from workbench.evidence.other_maxima import sources_that_turn
from workbench.evidence.results import Evidence
from workbench.evidence.weigh import weigh
from workbench.likelihood.model import compile_model

EVENTS = 400.0


def background(observed: float, up: float, down: float) -> Evidence:
    """Return the evidence of a background whose size a source changes."""
    region = one_bin("only", observed, background=EVENTS, signal=20.0)
    analysis = templates(region, None, (source("size", background=(up, down)),))
    return weigh(analysis).evidences[0]


def by_quadrature(observed: float, up: float, down: float) -> float:
    """Return the same by scipy's adaptive quadrature over the source, from the contract's formula."""
    u, d = np.log1p(up), np.log1p(down)

    def density(z: float) -> float:
        g = (np.sqrt(z * z + 0.0625) - 0.25) / (np.sqrt(1.0625) - 0.25)
        expected = EVENTS * np.exp(0.5 * (u - d) * z + 0.5 * (u + d) * g)
        return float(stats.norm.pdf(z) * stats.poisson.pmf(observed, expected))

    value = integrate.quad(density, -8.0, 8.0, points=[-1.0, 0.0, 1.0], epsabs=0.0, limit=500)[0]
    return float(np.log(value))


@pytest.mark.parametrize("down", [0.2, 0.25, 0.3])
def test_an_evidence_with_a_maximum_on_each_side_is_no_half_told_as_the_whole(down: float) -> None:
    """It was established, with an error of 0.003, and ln 2 too small."""
    found = background(520.0, 0.3, down)
    assert found.ln_evidence is not None
    assert found.error is not None
    off = abs(found.ln_evidence - by_quadrature(520.0, 0.3, down))
    assert not found.established or off < 4.0 * found.error


@pytest.mark.parametrize(("observed", "down"), [(400.0, 0.3), (520.0, -0.2), (520.0, 0.001)])
def test_one_maximum_is_established(observed: float, down: float) -> None:
    found = background(observed, 0.3, down)
    assert found.established
    assert found.ln_evidence is not None
    assert found.error is not None
    assert abs(found.ln_evidence - by_quadrature(observed, 0.3, down)) < 4.0 * found.error


def test_sources_turn_where_both_variations_lie_on_one_side() -> None:
    region = one_bin("only", 5.0, background=4.0, signal=1.0)
    sources = (
        source("size", background=0.2),
        source("both sides", background=(0.2, -0.1)),
        source("one side", background=(0.2, 0.1)),
        source("nearly", background=(0.2, -0.01)),
        source("down", signal=(-0.2, -0.1)),
    )
    model = compile_model(templates(region, None, sources), "signal plus background")
    assert [model.names[index] for index in sources_that_turn(model)] == ["one side", "nearly", "down"]
