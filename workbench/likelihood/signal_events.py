"""What the priors of a signal mean in events, before any count is seen."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from workbench.errors import InputError, Problem, nearest, quoted
from workbench.hypotheses.alternatives import variants_of
from workbench.hypotheses.analysis import Analysis
from workbench.likelihood.model import Model, compile_model

Array = npt.NDArray[np.float64]

SHARES = (0.025, 0.16, 0.5, 0.84, 0.975)
POINTS = 4096


@dataclass(frozen=True, slots=True, eq=False)
class SignalEvents:
    """The expected events of a hypothesis' signal processes under their priors, all regions together.

    Attributes:
        hypothesis: its name.
        median: half of the prior expects fewer [events].
        central_68, central_95: ends of the central parts of the prior [events].
        errors: numerical errors of median, central_68 and central_95 in the order of their size, the ends of
            95 % first and last [events].
        ordered: (point,) events at evenly spread points of the prior, ascending, to draw it from [events].
    """

    hypothesis: str
    median: float
    central_68: tuple[float, float]
    central_95: tuple[float, float]
    errors: tuple[float, ...]
    ordered: Array


@np.errstate(all="ignore")  # a prior may reach to numbers of events that no double holds
def signal_events(analysis: Analysis, hypothesis: str, *, points: int = POINTS) -> SignalEvents:
    """Return what the priors of a hypothesis' signal parameters say in expected events.

    The signal parameters are spread over their priors together; nuisance parameters stay at their medians and
    sources at 0. Only what falls into a bin counts.

    Args:
        analysis: everything declared; observed counts are not used.
        hypothesis: the hypothesis' name.
        points: how many points the priors are spread over; a multiple of 4.

    Returns:
        Median and central parts of 68 % and 95 %, each with a numerical error that errs on the large side: by
        how much a quarter of the points, spread evenly too, differs at most. All 0 without a signal process.

    Raises:
        InputError: if there is no such hypothesis.

    Source:
        none, definition
    """
    model = _signal_model(analysis, hypothesis)
    events = _total(model, _spread(model, points))
    whole = np.quantile(events, SHARES)
    low_95, low_68, median, high_68, high_95 = (float(one) for one in whole)
    quarters = np.array([np.quantile(quarter, SHARES) for quarter in np.split(events, 4)])
    errors = tuple(float(one) for one in np.max(np.abs(quarters - whole), axis=0))
    return SignalEvents(hypothesis, median, (low_68, high_68), (low_95, high_95), errors, np.sort(events))


def signal_events_along(
    analysis: Analysis, hypothesis: str, parameter: str, values: Sequence[float] | Array
) -> Array:
    """Return the expected events of a hypothesis' signal along one parameter, to label its prior's axis.

    Args:
        analysis: everything declared.
        hypothesis: the hypothesis' name.
        parameter: a free parameter of the hypothesis.
        values: (point,) its values.

    Returns:
        (point,) events of all signal processes in all regions, every other parameter at its median.

    Raises:
        InputError: if there is no such hypothesis, or no such free parameter in it.

    Source:
        none, definition
    """
    model = _signal_model(analysis, hypothesis)
    if parameter not in model.names:
        raise InputError(
            Problem(
                "A parameter that is not free in this hypothesis",
                f"hypotheses.{hypothesis}",
                quoted(parameter),
                "a free parameter of the hypothesis",
                nearest(parameter, model.names),
            )
        )
    place = np.asarray(values, dtype=float)
    natural = model.seeds(np.zeros((place.size, model.size))).x.T.copy()
    natural[:, model.names.index(parameter)] = place
    by_process = model.by_process(model.natural_seeds(natural))
    return np.asarray(sum((one.sum(axis=1) for one in by_process.values()), np.zeros(place.size)))


def _signal_model(analysis: Analysis, hypothesis: str) -> Model:
    """Return the hypothesis with its signal processes only; they are the same whichever alternative holds."""
    variant = variants_of(analysis, hypothesis)[0]
    return compile_model(variant.analysis, hypothesis).restricted("signal", spare=False)


def _total(model: Model, points: Array) -> Array:
    by_process = model.by_process(model.seeds(points))
    return np.asarray(sum((one.sum(axis=1) for one in by_process.values()), np.zeros(points.shape[0])))


def _spread(model: Model, points: int) -> Array:
    """Return (point, coordinate) standard coordinates, those of signal parameters spread evenly.

    Point n has the parts n g^-1, n g^-2, ... (modulo 1) of the priors, g the root above 1 of
        g^(d + 1) = g + 1
    for d signal parameters: the golden ratio for one. Any run of points is spread evenly.

    Source:
        M. Roberts, The unreasonable effectiveness of quasirandom sequences (2018); from memory.
    """
    from scipy import special

    standard = np.zeros((points, model.size))
    number = model.signal.size
    root = 2.0
    for _ in range(64):
        root = (1.0 + root) ** (1.0 / (number + 1.0))
    steps = root ** -np.arange(1.0, number + 1.0)
    parts = (0.5 + np.arange(1, points + 1)[:, None] * steps) % 1.0
    standard[:, model.signal] = special.ndtri(np.clip(parts, 1e-12, 1.0 - 1e-12))
    return standard
