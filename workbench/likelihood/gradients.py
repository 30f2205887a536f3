"""First derivatives alone: for many sources far less work than second ones too."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from workbench.likelihood.model import Model
from workbench.likelihood.parts import Seeds
from workbench.likelihood.slopes import poisson_slopes

Array = npt.NDArray[np.float64]


def gradient(model: Model, seeds: Seeds, counts: Array) -> Array:
    """Return the first derivatives of the ln probability of counts.

    Sums over bins are taken before sources are told apart, so that all points together cost one matrix
    product a part.

    Args:
        model: a hypothesis.
        seeds: (coordinate, batch) parameter values with derivatives in the coordinates in force.
        counts: (bin,) or (batch, bin) counted events [events].

    Returns:
        (batch, coordinate) gradient.
    """
    if model.has_template_errors:
        return model.derivatives(seeds, counts)[1]
    batch = seeds.x.shape[1]
    overall, slopes, _ = model.overall.expanded(seeds.x)
    total = np.zeros((batch, model.bins)) + model.spare
    expanded = []
    for row, part in enumerate(model.parts):
        factor = overall[:, row, None]
        if part.by_bin is not None:
            factor = factor * part.by_bin.factors(seeds.x)
        local = seeds.moving(part.stem.local)
        events, first, _ = part.stem.expanded(seeds, local, factor)
        total[:, part.bins] += events
        expanded.append((part, local, events, first))
    t = poisson_slopes(counts, total).t
    found = np.zeros((batch, model.size))
    for row, (part, local, events, first) in enumerate(expanded):
        weighted = t[:, part.bins] * events
        found[:, model.overall.indices] += slopes[:, :, row] * weighted.sum(axis=1)[:, None]
        for slot, index in enumerate(local):
            found[:, index] += np.einsum("ni,ni->n", t[:, part.bins], first[slot])
        if part.by_bin is not None:
            found[:, part.by_bin.indices] += part.by_bin.pulls(seeds.x, weighted)
    return found
