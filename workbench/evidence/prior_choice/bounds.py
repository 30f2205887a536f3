"""The largest Bayes factor that classes of priors on a strength can reach.

Every prior of a class is a mixture of its extreme members, and B is linear in the prior, so that its largest
value is reached at an extreme member:

- any prior: points;
- densities that never rise away from 0: uniform from 0 to somewhere;
- densities with a single peak at a stated strength: uniform from there to somewhere, on either side
  (A.Y. Khintchine's representation of unimodal distributions).

Single-peaked with the peak anywhere is no restriction: a narrow peak at the best strength is a point. The
peak has to be stated without the data: 0, where nothing new is, or 1, the prediction.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from workbench.evidence.prior_choice.curve import StrengthCurve

Array = npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Bound:
    """The largest ln B of a class of priors.

    Attributes:
        name: a short name of the class: "any prior", "never rising", "peak at the prediction", "p-value".
        ln_bayes_factor: the largest ln B [nats].
        error: one standard error of it, numerical [nats]; 0 for a formula.
        low, high: ends of the uniform prior that reaches it, equal for a point; None where none does.
    """

    name: str
    ln_bayes_factor: float
    error: float
    low: float | None = None
    high: float | None = None


def largest_of_any(curve: StrengthCurve) -> Bound:
    """Return the largest ln B under any prior: R at the best strength.

    Args:
        curve: ln R of the strength.

    Returns:
        The bound, reached by a point.

    Source:
        W. Edwards, H. Lindman, L.J. Savage, Psychol. Rev. 70 (1963) 193; J.O. Berger, T. Sellke, J. Am. Stat.
        Assoc. 82 (1987) 112, theorem 1; from memory.
    """
    values = curve.at(curve.edges)
    best = int(np.argmax(values))
    place = float(curve.edges[best])
    return Bound("any prior", float(values[best]), curve.error_at(place), place, place)


def largest_never_rising(curve: StrengthCurve) -> Bound:
    """Return the largest ln B under priors whose density never rises away from 0.

    B = sup over t of (1/t) int_0^t R(s) ds

    Args:
        curve: ln R of the strength.

    Returns:
        The bound, reached by a uniform prior from 0.

    Source:
        J.O. Berger, T. Sellke, J. Am. Stat. Assoc. 82 (1987) 112, for a two-sided parameter, where the class
        is unimodal and symmetric around the null value, which folded at 0 is this one; J.O. Berger,
        M. Delampady, Stat. Sci. 2 (1987) 317; from memory.
    """
    return _largest_from(curve, 0.0, "never rising")


def largest_with_peak(curve: StrengthCurve, peak: float) -> Bound:
    """Return the largest ln B under priors with a single peak at a stated strength.

    B = sup over t of (1/|t - m|) |int_m^t R(s) ds|

    Args:
        curve: ln R of the strength.
        peak: m, stated without the data.

    Returns:
        The bound, reached by a uniform prior that ends there, or by the point itself.

    Source:
        A.Y. Khintchine's representation of unimodal distributions (W. Feller, An Introduction to Probability
        Theory and Its Applications II, section V.9); used so by Berger and Sellke (1987); from memory.
    """
    return _largest_from(curve, peak, "peak at the prediction")


def _largest_from(curve: StrengthCurve, start: float, name: str) -> Bound:
    edges = curve.edges
    top = float(curve.ln_cells.max())
    parts = np.exp(curve.ln_cells - top) * np.diff(edges)
    whole = np.concatenate([[0.0], np.cumsum(parts)])
    begun = float(np.interp(start, edges, whole))
    # Nearer than a cell, a quotient of differences loses its digits; R itself stands there.
    apart = np.abs(edges - start) > 1e-3 * curve.reach / 4.0
    means = (whole[apart] - begun) / (edges[apart] - start)
    best = int(np.argmax(means))
    at_start = float(curve.at(np.array(start)))
    if at_start >= top + float(np.log(means[best])):
        return Bound(name, at_start, curve.error_at(start), start, start)
    low, high = sorted((start, float(edges[apart][best])))
    inside = (edges[:-1] >= low) & (edges[1:] <= high)
    share = parts[inside] / parts[inside].sum()
    error = float(np.hypot((share * curve.cell_errors[inside]).sum(), curve.against_error))
    return Bound(name, top + float(np.log(means[best])), error, low, high)
