"""What a fit says of each parameter, and what stands out."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from workbench.errors import quoted
from workbench.hypotheses.priors import LogNormal
from workbench.likelihood.coordinates import Coordinate
from workbench.likelihood.model import Model
from workbench.likelihood.results import Ending, Fit, Fitted
from workbench.likelihood.sides import Side, Summit

Array = npt.NDArray[np.float64]

_DEGENERATE = 0.99
_PRIOR_DOMINATED = 0.05


def findings(model: Model, summit: Summit, ending: Ending, found: Mapping[int, tuple[Side, Side]]) -> Fit:
    """Return the fit of a hypothesis from its best point.

    Args:
        model: the hypothesis.
        summit: the best point with its covariance.
        ending: how the fit ended.
        found: coordinate to its errors on the low and the high side.

    Returns:
        The fit as the user gets it.
    """
    seeds = model.natural_seeds(summit.best[None])
    fitted = tuple(
        _fitted(coordinate, index, summit, *found.get(index, (None, None)))
        for index, coordinate in enumerate(model.coordinates)
    )
    return Fit(
        hypothesis=model.hypothesis,
        ending=ending,
        ln_likelihood=float(model.ln_likelihood(seeds, summit.counts)[0]),
        penalised=summit.value,
        fitted=fitted,
        correlations=summit.spread.correlations,
        expected=model.expected(seeds)[0][0],
        by_process={name: events[0] for name, events in model.by_process(seeds).items()},
        notes=_notes(fitted, summit),
    )


def unsupported(model: Model, point: Array) -> Fit:
    """Return the fit of counts that no parameter value can produce.

    Args:
        model: the hypothesis.
        point: (coordinate,) where its expectations are shown.

    Returns:
        A fit without parameters.
    """
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


def _fitted(coordinate: Coordinate, index: int, summit: Summit, low: Side, high: Side) -> Fitted:
    value = float(summit.best[index])
    error = float(summit.spread.errors[index]) if summit.spread.has_error[index] else None
    yardstick = _yardstick(coordinate, value)
    pull = contraction = None
    if yardstick is not None:
        pull = yardstick.distance / yardstick.sd if yardstick.has_centre else None
        contraction = None if error is None else 1.0 - (error / yardstick.width) ** 2
    return Fitted(
        name=coordinate.name,
        unit=coordinate.unit,
        role=coordinate.role,
        value=value,
        error=error,
        low=low,
        high=high,
        pull=pull,
        contraction=contraction,
        at_limit=bool(summit.spread.at_limit[index]),
    )


@dataclass(frozen=True, slots=True)
class _Yardstick:
    """A prior to measure a fitted value against.

    Attributes:
        distance: from the prior's centre, in the coordinate in which the penalty is taken.
        sd: the prior's standard deviation in that coordinate.
        width: the same as a length of the parameter at the fitted value.
        has_centre: False for a flat prior, which prefers no value.
    """

    distance: float
    sd: float
    width: float
    has_centre: bool


def _yardstick(coordinate: Coordinate, value: float) -> _Yardstick | None:
    """Return what a value is measured against; None for a signal parameter."""
    prior = coordinate.prior
    if coordinate.role == "signal":
        return None
    if isinstance(prior, LogNormal):
        sd = float(np.log(prior.factor))
        return _Yardstick(float(np.log(value / prior.median)), sd, value * sd, has_centre=True)
    sd = float(prior.sd)
    return _Yardstick(value - float(prior.mean), sd, sd, has_centre=not prior.is_flat)


def _notes(fitted: tuple[Fitted, ...], summit: Summit) -> tuple[str, ...]:
    spread = summit.spread
    flat = [one.name for one, is_flat in zip(fitted, spread.flat, strict=True) if is_flat]
    little = [
        one.name for one in fitted if one.contraction is not None and one.contraction < _PRIOR_DOMINATED
    ]
    notes = []
    if flat:
        notes.append(f"the data do not constrain {_named(flat)}; no error is quoted")
    for one, is_at_limit in zip(fitted, spread.at_limit, strict=True):
        if is_at_limit:
            one_sided = one.low is not None or one.high is not None
            notes.append(
                f"{quoted(one.name)} is at the end of its range: "
                + ("its error is one-sided" if one_sided else "no error is quoted")
            )
    notes += _degenerate(fitted, spread.correlations)
    if little:
        notes.append(f"the data say little about {_named(little)} (contraction below {_PRIOR_DOMINATED:g})")
    return tuple(notes)


def _degenerate(fitted: tuple[Fitted, ...], correlations: Array) -> list[str]:
    """Return a sentence for each pair that the data cannot tell apart."""
    return [
        f"the data cannot tell {quoted(fitted[second].name)} from {quoted(fitted[first].name)} "
        f"(correlation {correlations[first, second]:+.3f})"
        for first in range(len(fitted))
        for second in range(first)
        if abs(correlations[first, second]) > _DEGENERATE
    ]


def _named(names: list[str]) -> str:
    return ", ".join(quoted(name) for name in names)
