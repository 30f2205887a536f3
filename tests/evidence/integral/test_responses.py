"""How the nuisance maxima follow the signal coordinates, against the exact implicit derivative."""

from __future__ import annotations

import numpy as np

from tests.evidence.small_analyses import bump
from workbench.evidence.integral.quadrature import integrate
from workbench.evidence.integral.responses import responses
from workbench.hypotheses.uncertainties import Effect, Uncertainty
from workbench.likelihood.model import compile_model
from workbench.likelihood.objective import StandardObjective

CONTINUUM = 400.0 * -np.diff(np.exp(-np.linspace(0.0, 20.0, 41) / 8.0)) / -np.expm1(-20.0 / 8.0)


def test_responses_agree_with_the_implicit_derivative() -> None:
    """At a maximum d theta/dx = -H^-1 d2/(d theta dx), where both derivatives are exact.

    Differences of nodes half a resolution apart are not: averaged over where the evidence lies, a third of
    what there is to follow is allowed along the mass, a tenth along the strength. Draws that follow
    less well only have less even weights.
    """
    counts = np.round(CONTINUUM)
    counts[14:17] += 12.0
    sources = (
        Uncertainty("size", (Effect("continuum", 0.1),)),
        Uncertainty("efficiency", (Effect("peak", 0.1), Effect("continuum", 0.03))),
    )
    model = compile_model(bump(counts, uncertainties=sources), "signal plus background")
    grid = integrate(model, counts)
    assert grid is not None
    integrand, columns = grid.integrand, grid.columns
    found = responses(grid)
    objective = StandardObjective(model)
    points = columns.points.reshape(-1, model.size)
    weight = np.exp(columns.ln_height - columns.ln_height.max()).ravel()
    hessians = objective.derivatives(points, counts)[2]
    nuisance, signal = integrand.nuisance, [*integrand.outer, integrand.inner]
    block = hessians[:, nuisance[:, None], nuisance]
    cross = hessians[:, nuisance[:, None], np.array(signal, dtype=np.intp)]
    exact = np.swapaxes(-np.linalg.solve(block, cross), 1, 2)
    mass = model.coordinates[integrand.outer[0]].prior
    exact[:, 0] /= mass.from_standard(points[:, integrand.outer[0]])[1][:, None]
    for which, allowed in ((0, 0.35), (1, 0.1)):
        wrong = weight @ np.abs(found[:, which] - exact[:, which]) / weight.sum()
        there = weight @ np.abs(exact[:, which]) / weight.sum()
        assert (wrong < allowed * there).all()


def test_without_signal_coordinates_there_is_nothing_to_follow() -> None:
    sources = (Uncertainty("size", (Effect("continuum", 0.1),)),)
    counts = np.round(CONTINUUM)
    grid = integrate(compile_model(bump(counts, uncertainties=sources), "background only"), counts)
    assert grid is not None
    assert responses(grid).shape == (1, 0, 1)
