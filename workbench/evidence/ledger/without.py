"""A hypothesis with some bins taken out: nothing is expected in them and nothing was counted."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

import numpy as np
import numpy.typing as npt

from workbench.hypotheses.jets import Jet
from workbench.likelihood.model import Model
from workbench.likelihood.parts import Part, Stem

Array = npt.NDArray[np.float64]
Flags = npt.NDArray[np.bool_]


def without(model: Model, taken: Flags) -> Model:
    """Return a hypothesis that says nothing about some bins.

    Shapes and templates keep their normalisation: a process' expected events in all other bins stay what they
    were. Bins with no events expected and none counted have probability 1.

    Args:
        model: a hypothesis.
        taken: (bin,) True where a bin is taken out.

    Returns:
        The hypothesis with as many bins, those taken out empty.
    """
    kept = np.where(taken, 0.0, 1.0)
    observed = None if model.observed is None else model.observed * kept
    parts = tuple(_masked(part, kept[part.bins]) for part in model.parts)
    return replace(model, parts=parts, observed=observed, spare=model.spare * kept)


def _masked(part: Part, kept: Array) -> Part:
    error = None if part.error is None else _masked_stem(part.error, kept)
    return replace(part, stem=_masked_stem(part.stem, kept), error=error)


def _masked_stem(stem: Stem, kept: Array) -> Stem:
    def core(arguments: Mapping[str, Jet]) -> Jet:
        return stem.core(arguments) * kept

    fixed = None if stem.fixed_core is None else stem.fixed_core * kept
    return replace(stem, core=core, fixed_core=fixed)
