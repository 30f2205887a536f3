"""The break point of an analysis: how wrong its backgrounds must be, smoothly, to take the evidence away."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
import numpy.typing as npt

from workbench.errors import quoted
from workbench.evidence.breaking.pairs import declared_pair, pair_at
from workbench.evidence.breaking.question import Question, asked
from workbench.evidence.breaking.results import Breaking, BreakPoint, Distorted
from workbench.evidence.breaking.search import Target, is_settled, nearest, onward
from workbench.evidence.breaking.trials import Anchor
from workbench.hypotheses.analysis import Analysis
from workbench.likelihood.distortions import nominal_background

Array = npt.NDArray[np.float64]

DEFAULT_BELOW = 3.0
DEFAULT_WITHIN = 0.3
_PRIOR_DRAWS = 2000
_AGAIN = 4  # pairs of evidences that the answer and its error are made from


@np.errstate(all="ignore")  # an impossible point has ln probability -inf
def break_point(
    analysis: Analysis,
    *,
    below: float = DEFAULT_BELOW,
    hypothesis: str | None = None,
    terms: int | None = None,
    regions: Sequence[str] | None = None,
    within: float = DEFAULT_WITHIN,
    seed: int = 1,
) -> BreakPoint:
    """Return the smallest smooth distortion of the backgrounds that brings ln B down to a threshold.

    In each region all backgrounds, under both hypotheses, are multiplied by exp(sum of c_k f_k), with the
    functions that `Distortion` describes. Looked for is the smallest |c|, which is the rms of the relative
    distortion over the background's events, with ln B(c) at the threshold; c is held, as if the backgrounds
    were so, while everything declared keeps its uncertainty. What the declared uncertainties can absorb moves
    ln B little, so that the answer is a distortion that they can't absorb, and that looks like the signal.

    Args:
        analysis: everything declared, with observed counts.
        below: the threshold on ln B [nats]; any finite number.
        hypothesis: the signal hypothesis; None for the first that has a signal.
        terms: smooth functions in each region, the level counted; None for those of a distortion that the
            analysis declares, or 3.
        regions: the regions to distort; None for those of a declared distortion, or all where the hypothesis
            has both signal and background.
        within: the largest rms that is looked at; in (0, 1].
        seed: where every random number comes from.

    Returns:
        Size under the peak and over all, with errors, shape, and how they compare with the declared
        uncertainties; how the search ended where there is none.

    Raises:
        InputError: if there is no such hypothesis or region, a number is out of its range, the hypothesis has
            no signal or is the first, or a region has no observed counts.

    Limits:
        A larger number of terms finds smaller distortions: what is smooth is for the reader to say. The
        smallest is that of the directions tried: the linear response's, each term's, and the signal's
        likeness.

    Source:
        None, definition; the search names its sources.
    """
    question = asked(analysis, below, hypothesis, terms, regions, within, seed)
    origin = declared_pair(question)
    first = BreakPoint(
        hypothesis=question.models[0].hypothesis,
        against=question.models[1].hypothesis,
        below=below,
        within=within,
        terms=max(len(functions) for _, functions in question.regions.values()),
        ending=Breaking.NOT_ESTABLISHED if origin.reason else Breaking.BELOW_ALREADY,
        reason=origin.reason,
        ln_bayes_factor=None if origin.reason else origin.ln_bayes_factor,
        ln_bayes_factor_error=None if origin.reason else origin.error,
    )
    if origin.reason:
        return first
    signal = _mean_signal(question, origin)
    before, after = _stated(question, origin, signal)
    first = replace(first, stated_before=before, stated_after=after)
    if origin.ln_bayes_factor <= below:
        return first
    return _searched(question, origin, Target(below, float(np.log1p(within))), signal, first)


def _searched(
    question: Question, origin: Anchor, target: Target, signal: Array, first: BreakPoint
) -> BreakPoint:
    """Return what the search found, made again there with other random numbers."""
    made = 1

    def make(coefficients: Array, again: int = 0) -> Anchor:
        nonlocal made
        made += 1
        return pair_at(question, coefficients, origin, again)

    found = nearest(make, origin, target, _ways(question, signal))
    is_met = not found.reason and target.is_met(found)
    fresh = [make(found.coefficients, again) for again in range(1, _AGAIN + 1)] if is_met else []
    if any(one.reason for one in (found, *fresh)):
        reason = next(one.reason for one in (found, *fresh) if one.reason)
        return replace(first, ending=Breaking.NOT_ESTABLISHED, reason=reason, evidences=made)
    if not is_met and not is_settled(found, target):
        reason = (
            f"{quoted(first.hypothesis)}: no end within {made} pairs of evidences; ask for a smaller range"
        )
        return replace(first, ending=Breaking.NOT_SETTLED, reason=reason, evidences=made)
    places = np.array([onward(one, target) for one in fresh] or [found.coefficients])
    place = places.mean(axis=0)
    last = make(place, _AGAIN + 1)
    ended = replace(
        first,
        ending=Breaking.NOT_ESTABLISHED if last.reason else Breaking.FOUND if is_met else Breaking.NOT_WITHIN,
        reason=last.reason,
        reached=None if last.reason else last.ln_bayes_factor,
        reached_error=None if last.reason else last.error,
        distorted=() if last.reason else _distorted(question, place, signal),
        evidences=made,
    )
    return _measured(question, ended, places, last, signal) if ended.ending is Breaking.FOUND else ended


def _measured(
    question: Question, ended: BreakPoint, places: Array, last: Anchor, signal: Array
) -> BreakPoint:
    """Return the answer with its sizes and their errors.

    The errors come from the spread of the places that independent pairs of evidences lead to, and are at
    least what the error of their ln B moves the distortion along its own direction, error/slope.
    """
    place = places.mean(axis=0)
    size = float(np.linalg.norm(place))
    steepness = abs(float(_slope_at(last) @ place)) / size
    runs = float(np.sqrt(len(places)))
    least = last.error / runs / steepness / size
    others = [_distorted(question, one, signal) for one in places]
    under, rms = _under_peak(ended.distorted), _rms(ended.distorted)
    spread_under, spread_rms = (
        float(np.std([measure(one) for one in others], ddof=1)) / runs for measure in (_under_peak, _rms)
    )
    return replace(
        ended,
        under_peak=under,
        under_peak_error=max(spread_under, least * abs(under)),
        rms=rms,
        rms_error=max(spread_rms, least * rms),
    )


def _slope_at(anchor: Anchor) -> Array:
    here = anchor.trial(anchor.coefficients)
    return here.slope if here.is_reliable else anchor.tilt()


def _mean_signal(question: Question, origin: Anchor) -> Array:
    """Return (bin,) expected signal in the distorted bins, averaged over the posterior; spare events off."""
    draws = origin.draws[0]
    spare = question.models[0].spare[question.bins]
    weights = np.exp(draws.ln_weights - draws.ln_weights.max())
    return np.asarray(weights @ (draws.signal - spare) / weights.sum())


def _stated(question: Question, origin: Anchor, signal: Array) -> tuple[float, float]:
    """Return one relative sd of the background under the peak, before and after the counts.

    Before: half of the central 68.27 % of draws from the priors, so that a heavy tail does not decide it.
    """
    model = question.models[1]
    points = np.random.default_rng(question.seeds[1].entropy).standard_normal((_PRIOR_DRAWS, model.size))
    backgrounds = model.restricted("background", spare=False)
    drawn = backgrounds.expected(backgrounds.seeds(points))[0][:, question.bins] @ signal
    nominal = float(nominal_background(model)[question.bins] @ signal)
    low, high = np.quantile(drawn / nominal, [0.15865, 0.84135])
    draws = origin.draws[1]
    weights = np.exp(draws.ln_weights - draws.ln_weights.max())
    weights /= weights.sum()
    under = draws.background @ signal / nominal
    variance = float(weights @ (under - weights @ under) ** 2)
    return 0.5 * float(high - low), float(np.sqrt(variance))


def _ways(question: Question, signal: Array) -> Array:
    """Return (way, term) unit vectors: the family's likeness of the signal, and each term, up and down."""
    functions = question.functions
    likeness = functions @ signal
    ways = [likeness, *np.eye(len(functions))]
    lengths = [float(np.linalg.norm(way)) for way in ways]
    unit = np.array([way / length for way, length in zip(ways, lengths, strict=True) if length > 0.0])
    return np.concatenate([unit, -unit])


def _distorted(question: Question, coefficients: Array, signal: Array) -> tuple[Distorted, ...]:
    found = []
    row = column = 0
    nominal = nominal_background(question.models[1])
    for name, (bins, functions) in question.regions.items():
        terms, number = functions.shape
        own = coefficients[row : row + terms]
        found.append(
            Distorted(
                name,
                tuple(float(one) for one in own),
                np.expm1(own @ functions),
                nominal[bins],
                signal[column : column + number],
            )
        )
        row, column = row + terms, column + number
    return tuple(found)


def _under_peak(distorted: Sequence[Distorted]) -> float:
    changed = sum(float((one.signal * one.background) @ one.change) for one in distorted)
    return changed / sum(float(one.signal @ one.background) for one in distorted)


def _rms(distorted: Sequence[Distorted]) -> float:
    squares = [float(one.background @ one.change**2 / one.background.sum()) for one in distorted]
    return float(np.sqrt(sum(squares)))
