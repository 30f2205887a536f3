"""The 300 random analyses: 12 kinds, 25 of each, every one told by its number alone."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from tests.evidence.references.bump_cases import no_bumps, two_bumps, unknown_masses, unknown_widths
from tests.evidence.references.counting_cases import few_off_counts, one_sided_sources, single_counts
from tests.evidence.references.direct import Direct
from tests.evidence.references.ingredients import Draft, Rng
from tests.evidence.references.template_cases import (
    deficits,
    many_sources,
    moving_templates,
    small_simulations,
    twins,
)
from workbench.hypotheses.analysis import Analysis

Array = npt.NDArray[np.float64]

SEED = 3003
TOTAL = 300
KINDS: tuple[Callable[[Rng], Draft], ...] = (
    single_counts,
    few_off_counts,
    one_sided_sources,
    deficits,
    unknown_masses,
    two_bumps,
    no_bumps,
    unknown_widths,
    many_sources,
    small_simulations,
    twins,
    moving_templates,
)


@dataclass(frozen=True)
class Case:
    """One random analysis.

    Attributes:
        number: its place among all; everything follows from it.
        kind: what it is an example of.
        analysis: everything declared, with the counts drawn for it.
    """

    number: int
    kind: str
    analysis: Analysis


def case(number: int) -> Case:
    """Return one of the random analyses."""
    rng = np.random.default_rng([SEED, number])
    kind = KINDS[number % len(KINDS)]
    draft = kind(rng)
    return Case(number, kind.__name__.replace("_", " "), with_counts(draft, rng))


def with_counts(draft: Draft, rng: Rng) -> Analysis:
    """Return a draft's analysis with counts drawn: nuisances from their priors, the signal as it is said."""
    direct = Direct(draft.analysis, draft.analysis.hypotheses[-1].name)
    t = np.clip(rng.normal(size=(1, direct.size)), -2.0, 2.0)
    values = dict(direct.values(t)) | {name: np.array([value]) for name, value in draft.truth.items()}
    regions = []
    for region in draft.analysis.regions:
        total, variance = direct.expected(values)[region.name]
        mean = total[0] * draft.beside.get(region.name, 1.0)
        relative = (np.broadcast_to(variance, total.shape)[0]) / total[0] ** 2
        shape = 1.0 / np.maximum(relative, 1e-12)
        mean = np.where(relative > 0.0, mean * rng.gamma(shape) / shape, mean)
        counts = draft.forced.get(region.name, rng.poisson(mean).astype(float))
        regions.append(replace(region, table=replace(region.table, observed=counts, digest="")))
    return replace(draft.analysis, regions=tuple(regions))
