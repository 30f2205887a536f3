"""How ln B answers the events that an empty simulation is given.

Where no background can fill a bin, a region's `empty_bin_events` stands in for the missing simulation, under
every hypothesis alike. That number is a choice, so that ln B is shown for a tenth, once and ten times of it.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from workbench.errors import Caution, quoted
from workbench.evidence.integral.quadrature import Grid, integrate
from workbench.evidence.results import Comparison
from workbench.likelihood.model import Model

FACTORS = (0.1, 1.0, 10.0)

Three = tuple[float, float, float]


def ln_bayes_factors(
    models: Sequence[Model], grids: Sequence[Grid | None], comparisons: Sequence[Comparison]
) -> tuple[Three | None, ...]:
    """Return ln B with a tenth, once and ten times the events given to bins that no background fills.

    Evidences are integrated again with the other numbers; their changes are added to the reported ln B.

    Args:
        models: one a hypothesis.
        grids: its quadrature; None where it was not used.
        comparisons: every hypothesis but the first, against the first.

    Returns:
        Three ln B a comparison [nats]; None where neither hypothesis has such bins, or ln B is missing.

    Source:
        None, definition.
    """
    if not any(model.spare.any() for model in models):
        return (None,) * len(comparisons)
    changes = [_changes(model, grid) for model, grid in zip(models, grids, strict=True)]
    found: list[Three | None] = []
    for comparison, change in zip(comparisons, changes[1:], strict=True):
        value, moved = comparison.ln_bayes_factor, np.subtract(change, changes[0])
        if value is None or not moved.any() or not np.isfinite(moved).all():
            found.append(None)
        else:
            found.append((value + float(moved[0]), value, value + float(moved[2])))
    return tuple(found)


def empty_bin_cautions(
    models: Sequence[Model], grids: Sequence[Grid | None], comparisons: Sequence[Comparison]
) -> tuple[Caution, ...]:
    """Return what a reader should know about Bayes factors that rest on events chosen for empty bins.

    Args:
        models: one a hypothesis.
        grids: its quadrature; None where it was not used.
        comparisons: every hypothesis but the first, against the first.

    Returns:
        A caution for each comparison that such bins enter.

    Source:
        None, definition.
    """
    cautions = []
    found = ln_bayes_factors(models, grids, comparisons)
    for comparison, three in zip(comparisons, found, strict=True):
        if three is not None:
            few, given, many = (f"{value:.2f}".replace("-", "−") for value in three)
            cautions.append(
                Caution(
                    "empty-bin-events",
                    f"{quoted(comparison.hypothesis)} against {quoted(comparison.against)}: ln B depends on "
                    f"the events given to bins that no background fills; it is {few}, {given} and {many} "
                    "with a tenth, once and ten times as many.",
                )
            )
    return tuple(cautions)


def _changes(model: Model, grid: Grid | None) -> Three:
    """Return how ln evidence changes with a tenth, once and ten times the events."""
    if not model.spare.any():
        return (0.0, 0.0, 0.0)
    base = grid.ln_evidence if grid is not None else _ln_evidence(model, None)
    few, _, many = (_ln_evidence(replace(model, spare=factor * model.spare), grid) for factor in FACTORS)
    return (few - base, 0.0, many - base)


def _ln_evidence(model: Model, grid: Grid | None) -> float:
    """Return ln evidence by quadrature, or directly without free coordinates; nan where it can't be had."""
    if model.observed is None or (grid is None and model.size > 0):
        return float("nan")
    if grid is None:
        return float(model.ln_likelihood(model.seeds(np.zeros((1, 0))), model.observed)[0])
    again = integrate(model, model.observed, grid.mode)
    return float("nan") if again is None else again.ln_evidence
