"""Does a hypothesis describe the data at all: the saturated model, calibrated by pseudo-experiments."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import numpy.typing as npt

from workbench.ensembles.drawing import pseudo_experiments
from workbench.ensembles.results import Adequacy
from workbench.errors import InputError, Problem
from workbench.evidence.averaging import likeliest
from workbench.evidence.results import Weighing
from workbench.evidence.weigh import weigh
from workbench.hypotheses.alternatives import variants_of
from workbench.hypotheses.analysis import Analysis
from workbench.likelihood.laws import ln_saturated
from workbench.likelihood.model import Model, compile_model
from workbench.likelihood.starts import Searcher, best_points, searcher

Array = npt.NDArray[np.float64]

THRESHOLD = 0.01
_FIRST = 200
_ERRORS_AWAY = 3.0
_TOLERANCE = 1e-4
_SAME = 4.0 * _TOLERANCE  # the same counts fitted twice may differ by this much in T, and count as equal


@np.errstate(all="ignore")  # an impossible point has ln probability -inf, and a step to it is shortened
def adequacy(
    analysis: Analysis, hypothesis: str, *, seed: int = 1, most: int = 2000, weighing: Weighing | None = None
) -> Adequacy:
    """Return how often pseudo-experiments from a hypothesis fit it worse than the observed counts do.

        T = 2 (ln p of the saturated model - largest penalised ln p)
        p = (1 + pseudo-experiments with T at least as large)/(1 + their number)

    Sources, and nuisance parameters whose prior is not flat, are drawn from their priors, the others held at
    their fitted values; counts come from the hypothesis' law; each pseudo-experiment is fitted again. Drawn
    until p is 3 errors away from 0.01: at least 200, at most `most`.

    Where backgrounds have alternatives, the one with the largest posterior probability under the hypothesis
    is judged, and named.

    Args:
        analysis: everything declared, with observed counts.
        hypothesis: the hypothesis' name.
        seed: where the pseudo-experiments come from.
        most: pseudo-experiments at the most.
        weighing: what weighing the analysis found, where it is known; else it is weighed if there are
            alternatives.

    Returns:
        Statistic, p and its standard error.

    Raises:
        InputError: if there is no such hypothesis, a region has no observed counts, or `most` is below 1.

    Source:
        Saturated-model test: S. Baker, R.D. Cousins, Nucl. Instrum. Meth. 221 (1984) 437; from memory.
        p of a simulated ensemble: A.C. Davison, D.V. Hinkley, Bootstrap Methods and their Application (1997);
        from memory.
    """
    variants = variants_of(analysis, hypothesis)
    if len(variants) > 1:
        found = weigh(analysis, seed=seed) if weighing is None else weighing
        judged = likeliest(variants, found.evidence_of(hypothesis))
        return replace(adequacy(judged.analysis, hypothesis, seed=seed, most=most), alternative=judged.name)
    model = compile_model(analysis, hypothesis)
    counted = model.observed_for("adequacy")
    if most < 1:
        raise InputError(
            Problem(
                what="adequacy needs pseudo-experiments",
                where="most",
                found=str(most),
                expected="a whole number > 0",
                remedy=f"allow {_FIRST} or more",
            )
        )
    search = searcher(model)
    observed, points, _ = statistic(search, counted[None])
    held = _held(model, points[0])
    index = [one.name for one in analysis.hypotheses].index(hypothesis)
    source = np.random.SeedSequence(seed, spawn_key=(1, index))
    drawn = worse = unfinished = 0
    while True:
        batch = min(_FIRST, most - drawn) if drawn == 0 else min(2 * _FIRST, most - drawn)
        for counts in pseudo_experiments(model, source, batch, first=drawn, held=held):
            values, _, finished = statistic(search, counts)
            worse += int((values >= observed[0] - _SAME).sum())
            unfinished += int((~finished).sum())
        drawn += batch
        p, error = share(worse, drawn)
        if drawn >= most or abs(p - THRESHOLD) > _ERRORS_AWAY * error:
            return Adequacy(hypothesis, float(observed[0]), p, error, drawn, unfinished)


def share(worse: int, drawn: int) -> tuple[float, float]:
    """Return p of a simulated ensemble, with an error that is not 0 when all or none are worse.

        p = (1 + worse)/(1 + drawn),  error = sqrt(q (1 - q)/(drawn + 3)) with q = (1 + worse)/(2 + drawn)

    Args:
        worse: pseudo-experiments at least as extreme as what was observed.
        drawn: pseudo-experiments.

    Returns:
        p and its standard error.

    Source:
        p: A.C. Davison, D.V. Hinkley, Bootstrap Methods and their Application (1997); from memory. The error
            is the standard deviation of the beta distribution that a uniform prior of the share ends in;
            definition.
    """
    q = (1.0 + worse) / (2.0 + drawn)
    return (1.0 + worse) / (1.0 + drawn), float(np.sqrt(q * (1.0 - q) / (drawn + 3.0)))


def statistic(search: Searcher, counts: Array) -> tuple[Array, Array, npt.NDArray[np.bool_]]:
    """Return (row,) T of each row of counts, the best-fit points and whether each fit converged.

    Args:
        search: the hypothesis' searcher.
        counts: (row, bin) counts [events].

    Returns:
        T [2 nats], (row, coordinate) points, (row,) convergence.
    """
    points, values, converged = best_points(search, counts, tolerance=_TOLERANCE)
    return 2.0 * (ln_saturated(counts) - values), points, converged


def _held(model: Model, fitted: Array) -> Array:
    """Return (coordinate,) fitted values of what is not drawn from its prior, nan elsewhere."""
    drawn = [
        coordinate.role == "source" or (coordinate.role == "nuisance" and not coordinate.prior.is_flat)
        for coordinate in model.coordinates
    ]
    return np.where(np.array(drawn, dtype=bool), np.nan, fitted)
