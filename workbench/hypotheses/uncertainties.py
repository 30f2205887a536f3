"""Sources of systematic uncertainty and what they do."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from workbench.hypotheses.jets import Derivatives

KNEE = 0.25  # where the curve turns from a parabola to a line [standard deviations]


@dataclass(frozen=True, slots=True)
class Effect:
    """What one source does to one process.

    Attributes:
        process: the process it acts on.
        up: relative change at z = +1 (a number > -1), or the name of a template column.
        down: the same at z = -1; None for a one-number effect, whose factor is (1 + up)**z.
        regions: the regions it is limited to; None for all of the process' regions.
    """

    process: str
    up: float | str
    down: float | str | None = None
    regions: tuple[str, ...] | None = None


@dataclass(frozen=True, slots=True)
class Uncertainty:
    """A named source: one standard-normal nuisance parameter for all it names.

    Attributes:
        name: the source's name.
        effects: what it does to each process.
        regions: the regions it is limited to; None for all.
    """

    name: str
    effects: tuple[Effect, ...]
    regions: tuple[str, ...] | None = None


def curvature(z: npt.ArrayLike) -> Derivatives:
    """Return the smooth even curve that bends a two-sided effect, with its derivatives.

    With u, d the ln factors at z = +1 and -1, the ln factor is (u - d) z/2 + (u + d) g(z)/2, where
        g(z) = (sqrt(z^2 + c^2) - c)/(sqrt(1 + c^2) - c),   c = 1/4
    so that g(0) = 0, g(-1) = g(1) = 1, and g grows like |z| far out.

    Args:
        z: (...) nuisance parameter of the source [standard deviations].

    Returns:
        (...) g, dg/dz and d2g/dz2.

    Source:
        None, definition (the analysis file's convention for two-sided effects).
    """
    place = np.asarray(z, dtype=float)
    root = np.sqrt(place * place + KNEE**2)
    unit = np.sqrt(1.0 + KNEE**2) - KNEE
    # z^2/(root + c) is root - c without its cancellation near 0.
    return Derivatives(place * place / (root + KNEE) / unit, place / root / unit, KNEE**2 / root**3 / unit)
