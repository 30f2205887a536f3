"""Other readings of an uncertainty whose variations lie on the same side, with ln B under each."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np

from workbench.counts.magnitudes import is_workable
from workbench.errors import Caution, quoted
from workbench.evidence.integral.quadrature import Grid, integrate
from workbench.evidence.integral.sampling import sample
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.uncertainties import Effect, Uncertainty
from workbench.likelihood.model import compile_model

_MOST = 4
_DRAWS = 256


@dataclass(frozen=True, slots=True)
class Reading:
    """An analysis with one effect read otherwise, and the reading in words."""

    analysis: Analysis
    words: str


def one_sided_cautions(analysis: Analysis, grids: Sequence[Grid | None]) -> tuple[Caution, ...]:
    """Return what ln B would be if effects on one side only meant a size.

    Two variations on the same side leave open what was meant. As given, the source moves the yield one way
    whatever its sign. Read as a size, it is the larger of the two, or half of their distance. Each reading is
    integrated again; what is said is the change of the sampling passes, since a yield that turns back at 0
    has two modes, of which Laplace knows one.

    Args:
        analysis: everything declared.
        grids: the quadrature of each hypothesis, in order; None where it was not used.

    Returns:
        One caution for each such effect, at most four; none where a hypothesis has no quadrature.

    Source:
        None; that such variations call for a decision is common practice, no source.
    """
    present = [grid for grid in grids if grid is not None]
    if len(present) < len(analysis.hypotheses):
        return ()
    found = []
    for source, effect in list(_effects(analysis))[:_MOST]:
        changes = [
            f"{reading.words}, {_changes(reading.analysis, present)}"
            for reading in _readings(analysis, source, effect)
        ]
        found.append(
            Caution(
                "one-sided-reading",
                f"{quoted(source.name)} on {quoted(effect.process)} has both variations on one side; read as "
                + "; read as ".join(changes),
            )
        )
    return tuple(found)


def _effects(analysis: Analysis) -> Iterator[tuple[Uncertainty, Effect]]:
    for source in analysis.uncertainties:
        for effect in source.effects:
            up, down = effect.up, effect.down
            if isinstance(up, float | int) and isinstance(down, float | int) and up * down > 0.0:
                yield source, effect


def _readings(analysis: Analysis, source: Uncertainty, effect: Effect) -> list[Reading]:
    """Return the analysis with the effect as the larger size, and as half of the distance."""
    up, down = float(effect.up), float(effect.down or 0.0)
    larger = max(up, down, key=abs)
    readings = [(abs(larger), "the larger size")]
    if up != down and is_workable(0.5 * (up - down)):
        readings.append((0.5 * abs(up - down), "half of their distance"))
    made = []
    for size, words in readings:
        changed = replace(effect, up=size, down=None)
        effects = tuple(changed if one is effect else one for one in source.effects)
        uncertainties = tuple(
            replace(one, effects=effects) if one is source else one for one in analysis.uncertainties
        )
        other = replace(analysis, uncertainties=uncertainties)
        made.append(Reading(other, f"{words} ({100.0 * size:g} %)"))
    return made


def _changes(analysis: Analysis, grids: Sequence[Grid]) -> str:
    """Return in words how each ln B changes under another reading."""
    shifts = []
    for hypothesis, grid in zip(analysis.hypotheses, grids, strict=True):
        model = compile_model(analysis, hypothesis.name)
        again = integrate(model, grid.integrand.counts, grid.mode)
        shifts.append(np.nan if again is None else _sampled(again) - _sampled(grid))
    words = [
        f"ln B of {quoted(hypothesis.name)} changes by " + f"{shift - shifts[0]:+.2f}".replace("-", "−")
        for hypothesis, shift in zip(analysis.hypotheses[1:], shifts[1:], strict=True)
    ]
    return " and ".join(words)


def _sampled(grid: Grid) -> float:
    """Return ln evidence by sampling, the same random numbers for every reading."""
    try:
        return sample(grid, np.random.SeedSequence(0), _DRAWS).ln_evidence
    except np.linalg.LinAlgError:  # numbers too far apart for double precision
        return np.nan
