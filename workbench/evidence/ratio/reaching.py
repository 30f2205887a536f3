"""Where the updating ratio is known: ranges of its parameters, and priors that do not reach beyond them."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from workbench.errors import InputError, Problem, nearest, quoted
from workbench.evidence.ratio.averages import OUTSIDE, outside
from workbench.hypotheses.priors import Prior
from workbench.likelihood.model import Model
from workbench.likelihood.objective import fit_objective

Ends = tuple[float, float]
Priors = Mapping[str, Prior]

_TAIL = 2e-5  # of an endless prior's probability is left out on each side
_STRETCH = 2.0


def ranges_of(model: Model) -> list[Ends]:
    """Return the range of each signal coordinate in which R is worked out, in the model's order.

    A mass has its prior's whole range, all but 1 in 50,000 on each side where that has no end. A strength
    reaches from 0, or below where its prior does, to twice where its prior ends.

    Args:
        model: a hypothesis with signal parameters.
    """
    objective = fit_objective(model)
    found = []
    for index in model.signal:
        coordinate = model.coordinates[index]
        low, high = float(objective.low[index]), float(objective.high[index])
        bulk = coordinate.prior.quantile(np.array([_TAIL, 1.0 - _TAIL]))
        if not np.isfinite([low, high]).all():
            low, high = max(low, float(bulk[0])), min(high, float(bulk[1]))
        if coordinate.is_strength:
            low, high = min(low, 0.0), _STRETCH * max(high, 0.0)
        found.append((low, high))
    return found


def refuse_outside(
    priors: Mapping[str, Prior], ranges: Mapping[str, Ends], averaged: Mapping[str, Prior]
) -> None:
    """Refuse priors that nothing is known for.

    Args:
        priors: by parameter.
        ranges: the parameters that R is known over, with their ranges.
        averaged: parameters that R was averaged over.

    Raises:
        InputError: with every such prior.
    """
    problems = [
        problem
        for name, prior in priors.items()
        if (problem := _problem(name, prior, ranges, averaged)) is not None
    ]
    if problems:
        raise InputError(*problems)


def _problem(
    name: str, prior: Prior, ranges: Mapping[str, Ends], averaged: Mapping[str, Prior]
) -> Problem | None:
    where = f"prior of {quoted(name)}"
    known = " and ".join(quoted(one) for one in ranges)
    if name in averaged:
        return Problem(
            "A prior of a parameter that was averaged over",
            where,
            f"R was averaged over {averaged[name].text()}",
            f"a parameter that R is known over: {known}",
            f"scan over {quoted(name)} too, which keeps R free of its prior",
        )
    if name not in ranges:
        return Problem(
            "A prior of a parameter that R is not known over",
            where,
            quoted(name),
            known,
            nearest(name, ranges),
        )
    low, high = ranges[name]
    part = outside(prior, low, high)
    if part <= OUTSIDE:
        return None
    return Problem(
        "A prior that reaches outside the range in which R is known",
        where,
        f"{prior.text()}: {100.0 * part:.3g} % of it outside",
        f"at most {100.0 * OUTSIDE:g} % of it outside {low:g} to {high:g}",
        f"cut it off there, or scan again under a prior of {quoted(name)} that reaches as far",
    )
