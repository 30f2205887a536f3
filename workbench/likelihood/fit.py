"""Maximum likelihood of a hypothesis: values, errors, pulls, correlations, and how it ended.

The only file that imports iminuit. Batched Newton steps from every place where the counts ask for something
find the best point; iminuit then minimises from there with exact derivatives and says whether it converged.
Where no asymmetric errors are asked for, iminuit is loaded only if the Newton steps did not converge.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from workbench.hypotheses.alternatives import Variant, variants_of
from workbench.hypotheses.analysis import Analysis
from workbench.likelihood.covariance import spread
from workbench.likelihood.findings import findings, unsupported
from workbench.likelihood.model import compile_model
from workbench.likelihood.objective import FitObjective
from workbench.likelihood.results import Ending, Fit
from workbench.likelihood.sides import Side, Summit, sides
from workbench.likelihood.starts import Searcher, best_points, searcher

Array = npt.NDArray[np.float64]

_HIGHER = 1e-6
_CLIMBS = 3
_MOST_CALLS = 1000  # with exact derivatives, and from where Newton's steps ended, a few dozen are enough
_STARTS = 12


@np.errstate(all="ignore")  # an impossible point has ln probability -inf, and a step to it is shortened
def fit(analysis: Analysis, hypothesis: str, *, asymmetric: bool = True) -> Fit:
    """Return the maximum likelihood fit of a hypothesis to the observed counts.

    Maximised is ln p(n|x) plus penalties: -z^2/2 of a source; of a nuisance parameter its ln prior density
    (in ln x for lognormal and loguniform), constant dropped, so that a uniform prior is a range and nothing
    else; of a signal parameter nothing but its range.

    Args:
        analysis: everything declared, with observed counts.
        hypothesis: the hypothesis' name.
        asymmetric: also find, for parameters, the errors where the penalised ln likelihood has fallen by 1/2.

    Returns:
        Values, errors, pulls, correlations, expected counts, and how the fit ended. Where backgrounds have
        alternatives, each is fitted; the one with the largest penalised ln likelihood is returned, the
        others are kept in it.

    Raises:
        InputError: if there is no such hypothesis or a region has no observed counts.

    Limits:
        Errors from second derivatives mean nothing for a parameter at the end of its range; they are None
        there.

    Source:
        F. James, M. Roos, Comput. Phys. Commun. 10 (1975) 343 for the minimiser; from memory.
    """
    variants = variants_of(analysis, hypothesis)
    if len(variants) > 1:
        return _best_of(variants, hypothesis, asymmetric)
    model = compile_model(analysis, hypothesis)
    counts = model.observed_for("a fit")
    search = searcher(model)
    points, values, converged = best_points(search, counts[None], tolerance=1e-9, climbs=_STARTS)
    if not np.isfinite(values[0]):
        return unsupported(model, points[0])
    if not _is_smooth(search, points[0], counts):
        return findings(model, _summit(search, points[0], counts), Ending.NOT_CONVERGED, {})
    if converged[0] and not asymmetric:
        summit = _summit(search, points[0], counts)
        return findings(model, summit, _ending(True, summit), {})
    summit, found, is_sure = _climb(search, points[0], counts, asymmetric)
    return findings(model, summit, _ending(is_sure or bool(converged[0]), summit), found)


def _best_of(variants: Sequence[Variant], hypothesis: str, asymmetric: bool) -> Fit:
    """Return the best fit of several variants, the fits of the others in it."""
    fits = [
        replace(fit(one.analysis, hypothesis, asymmetric=asymmetric), alternative=one.name)
        for one in variants
    ]
    best, *others = sorted(fits, key=lambda one: -one.penalised)
    return replace(best, others=tuple(others))


def _is_smooth(search: Searcher, point: Array, counts: Array) -> bool:
    """Tell whether the point, and the derivatives there, are numbers that a minimiser can start from."""
    _, gradient, hessian = search.objective.derivatives(point[None], counts)
    return bool(np.isfinite(point).all() and np.isfinite(gradient).all() and np.isfinite(hessian).all())


def _summit(search: Searcher, best: Array, counts: Array) -> Summit:
    value = float(search.objective.value(best[None], counts)[0])
    width = spread(search.objective, best, counts, search.scale)
    return Summit(search.objective, counts, best, value, search.scale, width)


def _climb(
    search: Searcher, start: Array, counts: Array, asymmetric: bool
) -> tuple[Summit, dict[int, tuple[Side, Side]], bool]:
    """Return the summit reached from a start, its asymmetric errors, and whether iminuit converged.

    Where the search for the errors comes upon a higher point, the climb starts again from there.
    """
    objective = search.objective
    for _ in range(_CLIMBS):
        best, is_sure = _minimised(search, start, counts)
        summit = _summit(search, best, counts)
        if not asymmetric:
            return summit, {}, is_sure
        roles = [coordinate.role for coordinate in objective.model.coordinates]
        wanted = [
            index
            for index, role in enumerate(roles)
            if role != "source" and not (summit.spread.flat[index] and not summit.spread.at_limit[index])
        ]
        found, highest = sides(summit, np.array(wanted, dtype=np.intp))
        if float(objective.value(highest[None], counts)[0]) <= summit.value + _HIGHER:
            break
        start = highest
    return summit, found, is_sure


def _minimised(search: Searcher, start: Array, counts: Array) -> tuple[Array, bool]:
    """Return the best point after iminuit's run from a point, and whether iminuit converged."""
    if start.size == 0:
        return start, True
    from iminuit import Minuit

    objective = search.objective
    cost = _Cost(objective, counts, {})
    minuit = Minuit(
        cost.value,
        start,
        grad=cost.slope,
        g2=cost.bends,
        name=[f"x{index}" for index in range(start.size)],
    )
    minuit.errordef = Minuit.LIKELIHOOD
    minuit.strategy = 0
    minuit.print_level = -1  # at 0 its C++ writes remarks to standard output, amid the record
    minuit.errors = 0.1 * search.scale
    minuit.limits = [
        (None if np.isinf(low) else low, None if np.isinf(high) else high)
        for low, high in zip(objective.low, objective.high, strict=True)
    ]
    minuit.migrad(ncall=_MOST_CALLS, iterate=1)
    reached = np.array(minuit.values, dtype=float)
    is_better = cost.value(reached) < cost.value(start) - 1e-9
    return (reached if is_better else start), bool(minuit.valid)


@dataclass(frozen=True, slots=True, eq=False)
class _Cost:
    """What iminuit minimises, one point at a time, with exact derivatives worked out once a point."""

    objective: FitObjective
    counts: Array
    known: dict[bytes, tuple[Array, Array]]

    def value(self, x: Array) -> float:
        point = np.asarray(x, dtype=float)
        value = -float(self.objective.value(point[None], self.counts)[0])
        return value if np.isfinite(value) else 1e300

    def slope(self, x: Array) -> Array:
        return self._derivatives(x)[0]

    def bends(self, x: Array) -> Array:
        return self._derivatives(x)[1]

    def _derivatives(self, x: Array) -> tuple[Array, Array]:
        point = np.asarray(x, dtype=float)
        key = point.tobytes()
        if key not in self.known:
            _, gradient, hessian = self.objective.derivatives(point[None], self.counts)
            self.known[key] = (-gradient[0], -np.diag(hessian[0]))
        return self.known[key]


def _ending(is_sure: bool, summit: Summit) -> Ending:
    if summit.spread.flat.any():
        return Ending.FLAT
    if not is_sure:
        return Ending.NOT_CONVERGED
    return Ending.AT_LIMIT if summit.spread.pressed.any() else Ending.CONVERGED
