"""Whether the two estimators of an evidence agree, so that it may be called established."""

from __future__ import annotations

import numpy as np

from workbench.evidence.engines import LARGEST_ERROR, TOO_FAR_APART
from workbench.evidence.integral.nodes import LEAST_LN_HEIGHT
from workbench.evidence.integral.pareto import largest_allowed
from workbench.evidence.integral.quadrature import Grid
from workbench.evidence.integral.sampling import Sample
from workbench.evidence.other_maxima import OTHER_MAXIMUM, share_unreached
from workbench.evidence.results import largest_gap

# Beyond this k-hat sampling needs the quadrature, whose own error must then be below the next number.
_CONFIRMED_ABOVE, _LARGEST_ROUGHNESS = 0.5, 0.5


def doubt(grid: Grid, drawn: Sample) -> str:
    """Return why an evidence is not established; empty when it is.

    Args:
        grid: the quadrature.
        drawn: the sampling pass.
    """
    if not np.isfinite(drawn.ln_evidence):
        return "no draw can produce the observed counts"
    if grid.ln_evidence <= LEAST_LN_HEIGHT:
        return "the nuisance parameters have no maximum that Laplace could integrate around"
    if not np.isfinite([grid.ln_evidence, grid.error, drawn.error]).all():
        return TOO_FAR_APART
    return _overlooked(grid, drawn) or _disagreement(grid, drawn)


def _disagreement(grid: Grid, drawn: Sample) -> str:
    """Return what is too large: an error, k-hat, or the estimators' difference; empty where nothing is."""
    allowed = largest_allowed(drawn.ln_weights.size)
    if drawn.error > LARGEST_ERROR:
        return f"the sampling error of {drawn.error:.2g} is above {LARGEST_ERROR}"
    if drawn.k_hat >= allowed:
        return (
            f"a few draws dominate the sampling pass (k-hat {drawn.k_hat:.2f}, allowed below {allowed:.2f})"
        )
    if drawn.k_hat > _CONFIRMED_ABOVE and grid.error > _LARGEST_ROUGHNESS:
        return (
            f"a few draws weigh much (k-hat {drawn.k_hat:.2f}), and with an error of {grid.error:.2g} the "
            "quadrature can't confirm them"
        )
    gap = abs(grid.ln_evidence - drawn.ln_evidence)
    limit = largest_gap(grid.error, drawn.error)
    if not gap <= limit:
        return f"quadrature and sampling differ by {gap:.2g}, more than {limit:.2g}"
    return ""


def _overlooked(grid: Grid, drawn: Sample) -> str:
    """Return what both estimators may have left out, whatever they say; empty where there is nothing."""
    if grid.columns.is_cut:
        return (
            "counts and the strength's prior are too far apart: the integrand still rises where numbers end"
        )
    unreached = share_unreached(grid, drawn.ln_evidence)
    if unreached:
        return f"{OTHER_MAXIMUM} holds {unreached:.1%} of the evidence"
    return ""
