"""Maximum likelihood of a hypothesis: values, errors, pulls, correlations, and how it ended.

The only file that imports iminuit. Batched Newton steps from every place where the counts ask for something find the
best point; iminuit then minimises from there with exact gradients, says whether it converged, and finds the
asymmetric errors.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
import numpy.typing as npt

from workbench.errors import InputError, Problem
from workbench.hypotheses.analysis import Analysis
from workbench.likelihood.model import Coordinate, Model, compile_model
from workbench.likelihood.objective import FitObjective
from workbench.likelihood.results import Ending, Fit, Fitted
from workbench.likelihood.starts import Searcher, best_points, searcher

if TYPE_CHECKING:
    from iminuit import Minuit

Array = npt.NDArray[np.float64]
Flags = npt.NDArray[np.bool_]

_FLAT = 1e-6
_DEGENERATE = 0.99
_LIMIT_SHARE = 1e-4


def fit(analysis: Analysis, hypothesis: str, *, asymmetric: bool = True) -> Fit:
    """Return the maximum likelihood fit of a hypothesis to the observed counts.

    Maximised is ln p(n|x) plus penalties: -z^2/2 of a source; of a nuisance parameter its ln prior density, constant
    dropped, so that a uniform prior is a range and nothing else; of a signal parameter nothing but its range.

    Args:
        analysis: everything declared, with observed counts.
        hypothesis: the hypothesis' name.
        asymmetric: also find the errors where the penalised ln likelihood has fallen by 1/2.

    Returns:
        Values, errors, pulls, correlations, expected counts, and how the fit ended.

    Raises:
        InputError: if there is no such hypothesis or a region has no observed counts.

    Limits:
        Errors from second derivatives mean nothing for a parameter at the end of its range; they are None there.
    """
    model = compile_model(analysis, hypothesis)
    counts = model.observed
    if counts is None:
        raise InputError(
            Problem(
                what="a fit needs observed counts",
                where=f"hypothesis {hypothesis!r}",
                found="a region without `observed`",
                expected="observed counts in every bin",
                remedy="add an `observed` column",
            )
        )
    search = searcher(model)
    points, values, _ = best_points(search, counts[None], tolerance=1e-9)
    if not np.isfinite(values[0]):
        return _unsupported(model, points[0])
    if model.size == 0:
        return _answer(search, points[0], np.zeros((0, 0)), Ending.CONVERGED, {}, counts)
    minuit = _minimised(search, points[0], counts)
    best = np.array(minuit.values, dtype=float)
    at_limit = _pressed(search, best, counts)
    covariance, flat = _covariance(search, best, counts, at_limit)
    asymmetries = _asymmetries(minuit, search, at_limit | flat) if asymmetric and minuit.valid else {}
    ending = _ending(minuit.valid, at_limit, flat)
    return _answer(search, best, covariance, ending, asymmetries, counts)


def _minimised(search: Searcher, start: Array, counts: Array) -> Minuit:
    """Return iminuit's minimiser after its run from a point that is already best."""
    from iminuit import Minuit  # noqa: PLC0415 - half of the command's start-up time

    objective = search.objective
    names = [f"x{index}" for index in range(objective.model.size)]

    def cost(x: Array) -> float:
        value = -float(objective.value(np.asarray(x, dtype=float)[None], counts)[0])
        return value if np.isfinite(value) else 1e300

    def slope(x: Array) -> Array:
        return np.nan_to_num(-objective.derivatives(np.asarray(x, dtype=float)[None], counts)[1][0])

    minuit = Minuit(cost, start, grad=slope, name=names)
    minuit.errordef = Minuit.LIKELIHOOD
    minuit.strategy = 0
    minuit.errors = 0.1 * search.scale
    minuit.limits = [
        (None if np.isinf(low) else low, None if np.isinf(high) else high)
        for low, high in zip(objective.low, objective.high, strict=True)
    ]
    best = -float(objective.value(start[None], counts)[0])
    minuit.migrad()
    if minuit.fval is None or not minuit.fval <= best + 1e-9:
        minuit.values = start
    return minuit


def _pressed(search: Searcher, best: Array, counts: Array) -> Flags:
    """Return (coordinate,) True where the value is at an end of its range and the slope points outward."""
    objective = search.objective
    gradient = objective.derivatives(best[None], counts)[1][0]
    near_low = best - objective.low <= _LIMIT_SHARE * search.scale
    near_high = objective.high - best <= _LIMIT_SHARE * search.scale
    return np.asarray((near_low & (gradient < 0.0)) | (near_high & (gradient > 0.0)))


def _covariance(search: Searcher, best: Array, counts: Array, held: Flags) -> tuple[Array, Flags]:
    """Return the inverse of the exact Hessian over what may move, and which coordinates the data leave flat."""
    curvature = -search.objective.derivatives(best[None], counts)[2][0]
    size = len(best)
    covariance, flat = np.zeros((size, size)), np.zeros(size, dtype=bool)
    free = np.flatnonzero(~held)
    if free.size == 0:
        return covariance, flat
    scale = search.scale[free]
    scaled = curvature[np.ix_(free, free)] * scale[:, None] * scale[None, :]
    values, vectors = np.linalg.eigh(scaled)
    weak = values < _FLAT * max(1.0, float(np.abs(values).max()) * _FLAT)
    flat[free] = (vectors[:, weak] ** 2).sum(axis=1) > 0.1
    inverse = (vectors[:, ~weak] / values[~weak]) @ vectors[:, ~weak].T
    covariance[np.ix_(free, free)] = inverse * scale[:, None] * scale[None, :]
    return covariance, flat


def _asymmetries(minuit: Minuit, search: Searcher, without: Flags) -> dict[int, tuple[float | None, float | None]]:
    """Return coordinate to its errors where the penalised ln likelihood has fallen by 1/2, low ones negative."""
    found: dict[int, tuple[float | None, float | None]] = {}
    for index, coordinate in enumerate(search.objective.model.coordinates):
        if coordinate.role == "source" or (without[index] and not _is_one_sided(search, index, minuit)):
            continue
        name = f"x{index}"
        try:
            minuit.minos(name)
        except (RuntimeError, ValueError):
            continue
        errors = minuit.merrors[name]
        low = None if errors.at_lower_limit or not errors.lower_valid else float(errors.lower)
        high = None if errors.at_upper_limit or not errors.upper_valid else float(errors.upper)
        found[index] = (low, high)
    return found


def _is_one_sided(search: Searcher, index: int, minuit: Minuit) -> bool:
    value = float(minuit.values[index])
    low, high = search.objective.low[index], search.objective.high[index]
    return bool(min(value - low, high - value) <= _LIMIT_SHARE * search.scale[index])


def _ending(valid: bool, at_limit: Flags, flat: Flags) -> Ending:
    if not valid and not flat.any():
        return Ending.NOT_CONVERGED
    if flat.any():
        return Ending.FLAT
    return Ending.AT_LIMIT if at_limit.any() else Ending.CONVERGED


def _answer(
    search: Searcher,
    best: Array,
    covariance: Array,
    ending: Ending,
    asymmetries: dict[int, tuple[float | None, float | None]],
    counts: Array,
) -> Fit:
    objective, model = search.objective, search.objective.model
    seeds = model.natural_seeds(best[None])
    variance = np.diag(covariance)
    sd = np.sqrt(np.maximum(variance, 0.0))
    norm = np.where(sd > 0.0, sd, np.inf)
    correlations = covariance / np.outer(norm, norm)
    expected = model.expected(seeds)[0][0]
    fitted = tuple(
        _fitted(objective, index, float(best[index]), float(sd[index]), asymmetries.get(index, (None, None)))
        for index in range(model.size)
    )
    return Fit(
        hypothesis=model.hypothesis,
        ending=ending,
        ln_likelihood=float(model.ln_likelihood(seeds, counts)[0]),
        penalised=float(objective.value(best[None], counts)[0]),
        fitted=fitted,
        correlations=correlations,
        expected=expected,
        by_process={name: events[0] for name, events in model.by_process(seeds).items()},
        notes=_notes(fitted, correlations, ending),
    )


def _fitted(
    objective: FitObjective, index: int, value: float, sd: float, sides: tuple[float | None, float | None]
) -> Fitted:
    coordinate = objective.model.coordinates[index]
    centre, width = _prior_centre(coordinate)
    low, high = objective.low[index], objective.high[index]
    pull = contraction = None
    if coordinate.role != "signal" and width > 0.0:
        pull = (value - centre) / width
        contraction = 1.0 - (sd / width) ** 2 if sd > 0.0 else None
    near = min(value - low, high - value) <= _LIMIT_SHARE * max(width, 1e-300)
    return Fitted(
        name=coordinate.name,
        unit=coordinate.unit,
        role=coordinate.role,
        value=value,
        error=sd if sd > 0.0 else None,
        low=sides[0],
        high=sides[1],
        pull=pull,
        contraction=contraction,
        at_limit=bool(near),
    )


def _prior_centre(coordinate: Coordinate) -> tuple[float, float]:
    """Return the prior's mean and standard deviation (0 and 1 for a source)."""
    if coordinate.role == "source":
        return 0.0, 1.0
    return float(coordinate.prior.mean), float(coordinate.prior.sd)


def _notes(fitted: tuple[Fitted, ...], correlations: Array, ending: Ending) -> tuple[str, ...]:
    notes = []
    flat = [one.name for one in fitted if one.error is None and not one.at_limit]
    if ending is Ending.FLAT and flat:
        notes.append("the data do not constrain " + ", ".join(flat) + "; no error is quoted")
    at_limit = [one.name for one in fitted if one.at_limit]
    if at_limit:
        notes.append("at the end of its range: " + ", ".join(at_limit))
    for first in range(len(fitted)):
        for second in range(first):
            size = abs(float(correlations[first, second]))
            if size > _DEGENERATE:
                notes.append(
                    f"the data cannot tell {fitted[second].name} from {fitted[first].name} (correlation {correlations[first, second]:+.3f})"
                )
    return tuple(notes)


def _unsupported(model: Model, point: Array) -> Fit:
    """Return the fit of counts that no parameter value can produce."""
    seeds = model.natural_seeds(point[None])
    return Fit(
        hypothesis=model.hypothesis,
        ending=Ending.NO_SUPPORT,
        ln_likelihood=float("-inf"),
        penalised=float("-inf"),
        fitted=(),
        correlations=np.zeros((0, 0)),
        expected=model.expected(seeds)[0][0],
        by_process={name: events[0] for name, events in model.by_process(seeds).items()},
    )
