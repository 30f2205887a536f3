"""The signal that a background would fake: its expected counts, taken for data, fitted with another."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from workbench.likelihood.covariance import spread
from workbench.likelihood.model import Model
from workbench.likelihood.newton import maximise
from workbench.likelihood.objective import FitObjective
from workbench.likelihood.starts import Searcher, best_points, searcher

Array = npt.NDArray[np.float64]

_ALMOST = 0.999  # of the way to where an expected count would be 0
_TOLERANCE = 1e-10


@dataclass(frozen=True, slots=True)
class FakedStrength:
    """A signal strength fitted to expected counts without any signal.

    Attributes:
        parameter: the strength's name.
        value: fitted strength; below 0 where the counts ask for fewer events than the background has.
        error: its standard error from the second derivatives; None where it has none.
        events: the signal's events that go with it.
        events_error: the same for the error; None where there is none.
        at: where the fit put the signal's other parameters, by name.
    """

    parameter: str
    value: float
    error: float | None
    events: float
    events_error: float | None
    at: tuple[tuple[str, float], ...] = ()

    @property
    def in_errors(self) -> float | None:
        """Return the strength in units of its error; None where it has none."""
        return None if not self.error else self.value / self.error


@np.errstate(all="ignore")  # a point with a negative expected count has no ln probability: no step ends there
def faked_strengths(model: Model, counts: Array) -> tuple[FakedStrength, ...]:
    """Return the signal that a hypothesis' fit finds in counts that have none.

    Maximised is what every fit maximises, but for one thing: a single strength may go below 0 as far as no
    expected count does, so that a fake deficit, which hides signals, shows as well. Several strengths keep
    their ranges. Where a mass is free, the signal is taken where the fit finds it.

    Args:
        model: a hypothesis with a signal.
        counts: (bin,) expected counts of some background [events]; need not be whole.

    Returns:
        One entry for each signal strength; none for a signal of known size.

    Limits:
        Errors from second derivatives suppose a parabola.

    Source:
        That a background function be judged by the signal it fakes in another one's expected counts is common
        practice, no source.
    """
    names = [coordinate.name for coordinate in model.coordinates if coordinate.is_strength]
    if not names:
        return ()
    search = searcher(model)
    objective = _opened(search, names)
    closed, _, _ = best_points(search, counts[None], tolerance=_TOLERANCE)
    found = maximise(objective, closed, counts, scale=search.scale, tolerance=_TOLERANCE)
    best = found.points[0]
    errors = spread(objective, best, counts, search.scale)
    seeds = model.natural_seeds(best[None])
    slopes = model.responses(seeds)[0].sum(axis=-1)
    events = model.by_process(seeds)
    at = tuple(
        (coordinate.name, float(best[index]))
        for index, coordinate in enumerate(model.coordinates)
        if coordinate.role == "signal" and not coordinate.is_strength
    )
    made = []
    for name in names:
        index = model.names.index(name)
        error = float(errors.errors[index]) if errors.has_error[index] else None
        made.append(
            FakedStrength(
                name,
                float(best[index]),
                error,
                sum(float(events[process].sum()) for process in _scaled_by(model, name)),
                None if error is None else error * float(slopes[index]),
                at,
            )
        )
    return tuple(made)


def _scaled_by(model: Model, name: str) -> list[str]:
    """Return the processes that a strength multiplies."""
    processes = model.analysis.processes_of(model.hypothesis)
    return [process.name for process in processes if name in process.factors]


def _opened(search: Searcher, names: list[str]) -> FitObjective:
    """Return what is maximised, a single strength free to go below 0 as far as no expected count does."""
    objective = search.objective
    model = objective.model
    processes = model.analysis.processes_of(model.hypothesis)
    is_linear = len(names) == 1 and all(process.factors.count(names[0]) <= 1 for process in processes)
    if not is_linear or not model.signal.size:
        return objective
    index = model.names.index(names[0])
    unit = search.events / np.maximum(search.grid[:, index, None], 1e-300)
    background = search.background.model
    expected, _ = background.expected(background.natural_seeds(search.centre[None]))
    ratio = np.where(unit > 0.0, expected / np.where(unit > 0.0, unit, 1.0), np.inf)
    low = objective.low.copy()
    low[index] = min(low[index], -_ALMOST * float(ratio.min()))
    return replace(objective, low=low)
