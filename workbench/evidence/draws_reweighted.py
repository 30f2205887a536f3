"""The evidence under another prior of one coordinate, from draws that stand."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.evidence.drawn import Drawn
from workbench.hypotheses.priors import Prior

Array = npt.NDArray[np.float64]

_LEAST_EFFECTIVE = 1000  # draws along a chain are not independent
_NEGLIGIBLE = 0.01
_EDGE = 0.05


@np.errstate(all="ignore")
def ln_change_of_draws(drawn: Drawn, index: int, declared: Prior, other: Prior) -> float | None:
    """Return how ln evidence changes when a coordinate has another prior.

    With w the draws' weights in the posterior, adding up to 1:
        ln(Z'/Z) = ln sum over draws of w other(x)/declared(x)

    Args:
        drawn: draws under the declared prior.
        index: the coordinate.
        declared: its prior.
        other: another prior.

    Returns:
        ln of the ratio [nats]; None where too few draws would carry it, or where the other prior reaches
        beyond what the declared one holds and the counts don't rule that out.

    Source:
        Importance sampling: A. Owen, Monte Carlo theory, methods and examples (2013), chapter 9; from memory.
    """
    if drawn.ln_weights.size == 0:
        return None
    t = drawn.points[:, index]
    x = declared.from_standard(t)[0]
    ln_ratio = np.nan_to_num(other.ln_density(x) - declared.ln_density(x), nan=-np.inf)
    weights = special.softmax(drawn.ln_weights)
    changed = weights * np.exp(ln_ratio)
    total = float(changed.sum())
    if not total > 0.0 or total**2 / float((changed**2).sum()) < _LEAST_EFFECTIVE:
        return None
    place = special.ndtr(t)
    beyond = _outside(declared, other)
    # At an end of the declared prior, the posterior's share over the prior's is the likelihood over Z there.
    at_ends = np.array([weights[place < _EDGE].sum(), weights[place > 1.0 - _EDGE].sum()]) / _EDGE
    if (beyond * at_ends).sum() > _NEGLIGIBLE * total:
        return None
    return float(np.log(total))


def _outside(declared: Prior, other: Prior) -> Array:
    """Return how much of the other prior lies below and above the declared one's support."""
    low, high = declared.support
    below = float(special.ndtr(other.to_standard(low))) if np.isfinite(low) else 0.0
    above = float(special.ndtr(-other.to_standard(high))) if np.isfinite(high) else 0.0
    return np.array([below, above])
