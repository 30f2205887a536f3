"""Several resonances at once: four signal axes and two mirror modes, beyond what quadrature lays out."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest

from tests.evidence.resonances import expected, ln_evidences, resonances
from workbench.evidence.annealing import annealed
from workbench.evidence.annealing.annealed import anneal, terrain_of
from workbench.likelihood.model import compile_model

Array = npt.NDArray[np.float64]

BINS = 40
TWO_BUMPS = np.random.default_rng(4).poisson(expected(BINS, (6.0, 28.0), (13.0, 18.0))).astype(float)
NO_BUMP = np.random.default_rng(5).poisson(expected(BINS)).astype(float)


@pytest.mark.slow
@pytest.mark.parametrize("counts", [TWO_BUMPS, NO_BUMP], ids=["two bumps", "none"])
def test_none_one_and_two_resonances_have_their_evidences(counts: Array) -> None:
    for name, exact in zip(("1 resonance", "2 resonances"), ln_evidences(counts)[1:], strict=True):
        model = compile_model(resonances(counts, 2), name)
        found = anneal(terrain_of(model, counts), np.random.SeedSequence(3))
        print(f"{name}: {found.ln_evidence:.3f} ± {found.error:.3f}, by brute force {exact:.3f}")
        assert not found.doubt
        assert abs(found.ln_evidence - exact) < 4.0 * found.error + 0.005


def test_both_orders_of_two_resonances_are_found() -> None:
    """Mirror modes hold equally many draws, so that the exchange is counted once, not half or twice."""
    model = compile_model(resonances(TWO_BUMPS, 2), "2 resonances")
    found = anneal(terrain_of(model, TWO_BUMPS), np.random.SeedSequence(3), wanted_error=0.1)
    first, second = (model.names.index(f"mass {k}") for k in (1, 2))
    share = np.exp(found.ln_weights - found.ln_weights.max())
    ahead = float(share @ (found.points[:, first] < found.points[:, second]) / share.sum())
    assert abs(ahead - 0.5) < 0.05
    assert annealed.POPULATIONS == 16
