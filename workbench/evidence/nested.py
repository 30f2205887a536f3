"""The evidence by nested sampling with dynesty, several seeds, their scatter in the error.

dynesty is in the extra `[nested]`; this is the only file that imports it, and only when it is asked for.
"""

from __future__ import annotations

import warnings
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.errors import InputError, Problem
from workbench.evidence.drawn import Drawn, widened
from workbench.likelihood.model import Model

Array = npt.NDArray[np.float64]

NAME = "nested sampling"
LEAST_RUNS = 3
_MOST_RUNS = 8
_WANTED_ERROR = 0.08
_LIVE = 400
_LEFT = 0.01
_LEAST_LN = -1e300
_LARGEST_SCATTER = 3.0


@dataclass(frozen=True, slots=True, eq=False)
class Run:
    """One nested-sampling run.

    Attributes:
        ln_evidence, error: ln Z and the error that the run itself reports [nats].
        evaluations: points at which the likelihood was worked out.
        points: (draw, coordinate) standard coordinates.
        ln_weights: (draw,) ln of likelihood times prior volume, whose exponentials add up to Z [nats].
    """

    ln_evidence: float
    error: float
    evaluations: int
    points: Array
    ln_weights: Array


def sample_nested(model: Model, counts: Array, seed: np.random.SeedSequence, *, live: int = _LIVE) -> Drawn:
    """Return the evidence of a hypothesis by nested sampling over its standard-normal coordinates.

    With R runs of ln Z_r and reported errors e_r, at least three and more until the error is below 0.08:
        error = max( sqrt(sum e_r^2)/R,  t_R sd(ln Z_r)/sqrt(R) )
    Reported errors take the points of a run for independent and say less than runs differ by; the scatter of
    few runs may be small by luck, so that Student's t widens it and the larger of both counts.

    Args:
        model: a hypothesis with at least one coordinate.
        counts: (bin,) observed counts [events].
        seed: where every random number comes from; each run has a child of its own.
        live: live points.

    Returns:
        ln evidence with its error, the runs' doubt, and draws of all runs.

    Raises:
        InputError: if dynesty is not installed.

    Source:
        J. Skilling, Bayesian Anal. 1 (2006) 833; J.S. Speagle, MNRAS 493 (2020) 3132; from memory.
    """
    dynesty = _dynesty()
    runs: list[Run] = []
    for child in seed.spawn(_MOST_RUNS):
        runs.append(_run(dynesty, model, counts, child, live))
        if len(runs) >= LEAST_RUNS and combined_error(runs) <= _WANTED_ERROR:
            break
    each = np.array([run.ln_evidence for run in runs])
    ln_weights = np.concatenate([run.ln_weights for run in runs])
    return Drawn(
        NAME,
        float(each.mean()),
        combined_error(runs),
        scatter(runs),
        sum(run.evaluations for run in runs),
        each,
        np.concatenate([run.points for run in runs]),
        ln_weights + np.log(ln_weights.size / len(runs)),
    )


def combined_error(runs: list[Run]) -> float:
    """Return the error of the mean of runs: what they report or how they scatter, whichever is larger."""
    each = np.array([run.ln_evidence for run in runs])
    reported = np.sqrt(sum(run.error**2 for run in runs)) / len(runs)
    return float(max(reported, widened(len(runs)) * each.std(ddof=1) / np.sqrt(len(runs))))


def scatter(runs: list[Run]) -> str:
    """Return why runs don't support each other; empty where they do."""
    each = np.array([run.ln_evidence for run in runs])
    if not np.isfinite(each).all():
        return "no draw can produce the observed counts"
    reported = float(np.sqrt(np.mean([run.error**2 for run in runs])))
    found = float(each.std(ddof=1))
    if found > _LARGEST_SCATTER * reported:
        return (
            f"runs of nested sampling differ by {found:.2g}, more than {_LARGEST_SCATTER:g} times the "
            f"{reported:.2g} that they report"
        )
    return ""


def _dynesty() -> Any:
    try:
        import dynesty
    except ImportError as missing:
        raise InputError(
            Problem(
                "Nested sampling needs dynesty",
                'the engine "nested"',
                "no package dynesty in this environment",
                "the extra [nested]",
                "pip install 'oddsbench[nested]', or the engine \"annealed\", which needs nothing more",
            )
        ) from missing
    return dynesty


def _run(dynesty: Any, model: Model, counts: Array, child: np.random.SeedSequence, live: int) -> Run:
    def ln_likelihood(point: Array) -> float:
        found = float(model.ln_likelihood(model.seeds(np.asarray(point)[None]), counts)[0])
        return found if np.isfinite(found) else _LEAST_LN

    sampler = dynesty.NestedSampler(
        ln_likelihood,
        from_cube,
        model.size,
        nlive=live,
        sample="rwalk",
        rstate=np.random.default_rng(child),
    )
    with warnings.catch_warnings(), np.errstate(all="ignore"):
        warnings.simplefilter("ignore")  # of plateaus, where the counts say nothing
        sampler.run_nested(print_progress=False, dlogz=_LEFT)
    found = sampler.results
    value = float(found.logz[-1])
    return Run(
        value if value > 0.1 * _LEAST_LN else -np.inf,
        float(found.logzerr[-1]),
        int(np.sum(found.ncall)),
        np.asarray(found.samples, dtype=float),
        np.asarray(found.logwt, dtype=float),
    )


def from_cube(cube: Array) -> Array:
    """Return standard-normal coordinates of points of the unit cube."""
    return np.asarray(special.ndtri(np.clip(cube, 1e-300, 1.0 - 1e-16)))
