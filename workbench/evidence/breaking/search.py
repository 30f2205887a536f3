"""The nearest point of a surface ln B(c) = threshold, within a ball around no distortion at all.

Each step goes to the nearest point at which the linear response would meet the threshold:

    c' = (slope . c - (ln B(c) - threshold)) slope/|slope|^2

or, where that lies outside the ball, to the point of its sphere towards which ln B falls. A step is halved
until |c|^2/2 + kappa max(0, ln B - threshold) falls.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from workbench.evidence.breaking.trials import Anchor, Trial

Array = npt.NDArray[np.float64]

_MOST_ANCHORS = 20
_MOST_STEPS = 60
_SHORTEST = 1.0 / 1024.0
_HALVINGS = 40
_SETTLED = 0.004  # of the distortion's size
_ARRIVED = 5e-4  # of the size of the goal
_SAME = 1e-5
_CLOSE = 0.003  # nats above the threshold that count as at it
_INSIDE = 0.93  # of the size found, where other directions are tried
_DOUBTFUL = 1.0  # nats above the threshold at which another direction is made by the engine
_LEAST_SLOPE = 1e-9
_CLOSE_BY = 0.2  # of the size; a shorter step is not doubted
_SHORTER = 3  # times that a long step is halved where it went wrong
_NEAR = 0.05  # of the size, that a settled search would still step
_PROMISE = 0.05  # nats that it would still gain


@dataclass(frozen=True, slots=True)
class Target:
    """What is looked for: ln B below a threshold, within a ball."""

    below: float
    within: float

    def is_met(self, anchor: Anchor) -> bool:
        """Tell whether ln B is at the threshold or below it, as far as its error tells."""
        return anchor.ln_bayes_factor <= self.below + max(_CLOSE, anchor.error)


def nearest(make: Callable[[Array], Anchor], origin: Anchor, target: Target, ways: Array) -> Anchor:
    """Return the smallest distortion that meets the threshold, or the one of the smallest ln B in the ball.

    Args:
        make: makes the pair of evidences under (term,) a distortion.
        origin: the pair without one.
        target: threshold and range.
        ways: (way, term) unit vectors along which a smaller distortion is looked for, besides where the
            linear response leads.

    Returns:
        The last pair of evidences; one that is not established ends the search.

    Source:
        A.M. Hasofer, N.C. Lind, J. Eng. Mech. Div. ASCE 100 (1974) 111; R. Rackwitz, B. Fiessler, Comput.
        Struct. 9 (1978) 489; from memory. The halving of steps and the other directions: none.
    """
    best = _descended(make, origin, target)
    for _ in range(len(ways)):
        if best.reason:
            break
        other = _better_start(make, origin, best, target, ways)
        if other is None:
            break
        again = _descended(make, other, target)
        if again.reason or not _is_better(again, best, target):
            break
        best = again
    return best


def _is_better(one: Anchor, other: Anchor, target: Target) -> bool:
    if target.is_met(one) and target.is_met(other):
        return _size(one.coefficients) < (1.0 - _SETTLED) * _size(other.coefficients)
    return target.is_met(one) or (
        not target.is_met(other) and one.ln_bayes_factor < other.ln_bayes_factor - 0.1
    )


def _better_start(
    make: Callable[[Array], Anchor], origin: Anchor, best: Anchor, target: Target, ways: Array
) -> Anchor | None:
    """Return a smaller distortion in another direction that meets the threshold, if there is one.

    Where nothing meets it, one that comes nearer to it. The draws without a distortion, or the engine where
    they don't reach so far or come near the threshold, say what ln B is there.
    """
    size = _size(best.coefficients) or target.within
    wanted = target.below if target.is_met(best) else best.ln_bayes_factor - 0.1
    for way in ways:
        if way @ best.coefficients > 0.97 * _size(best.coefficients):
            continue
        place = _INSIDE * size * way
        foreseen = origin.trial(place)
        if foreseen.is_reliable and foreseen.ln_bayes_factor > wanted + _DOUBTFUL:
            continue
        made = make(place)
        if not made.reason and made.ln_bayes_factor < wanted:
            return made
    return None


def _descended(make: Callable[[Array], Anchor], start: Anchor, target: Target) -> Anchor:
    """Return where steps from a pair of evidences end, made by the engine again as often as needed."""
    anchor = start
    for _ in range(_MOST_ANCHORS):
        place = onward(anchor, target)
        moved = _size(place - anchor.coefficients)
        is_at_edge = _size(place) > (1.0 - _SETTLED) * target.within
        if moved <= _SETTLED * _size(place) and (target.is_met(anchor) or is_at_edge):
            break
        if moved <= _SAME:
            break
        further = make(place)
        for _ in range(_SHORTER):
            if moved <= _CLOSE_BY * _size(place) or not _is_worse(further, anchor, target):
                break
            place = 0.5 * (place + anchor.coefficients)
            further = make(place)
        anchor = further
        if anchor.reason:
            break
    return anchor


def _is_worse(further: Anchor, anchor: Anchor, target: Target) -> bool:
    """Tell whether a long step went past where ln B is lowest, or to where nothing is established."""
    if further.reason:
        return True
    return further.ln_bayes_factor > max(anchor.ln_bayes_factor, target.below)


def onward(anchor: Anchor, target: Target) -> Array:
    """Return where to make the next pair of evidences.

    Args:
        anchor: the last pair.
        target: threshold and range.

    Returns:
        (term,) where its draws lead; where they don't reach half of the way, the goal of the linear response.
    """
    here = anchor.trial(anchor.coefficients)
    if here.is_reliable:
        place = stepped(anchor, target)
        way = _size(_goal(here, target) - here.coefficients)
        if _size(place - here.coefficients) >= 0.5 * way or way <= _SETTLED * _size(here.coefficients):
            return place
    else:
        here = replace(here, slope=anchor.tilt())
    return here.coefficients if _size(here.slope) < _LEAST_SLOPE else _goal(here, target)


def is_settled(anchor: Anchor, target: Target) -> bool:
    """Tell whether a pair of evidences is where the search wanted to end, and not where it ran out of steps.

    Args:
        anchor: the pair.
        target: threshold and range.

    Returns:
        True where the next step would be short, or where what it promises is nothing.
    """
    here = anchor.trial(anchor.coefficients)
    step = onward(anchor, target) - here.coefficients
    slope = here.slope if here.is_reliable else anchor.tilt()
    return _size(step) <= _NEAR * _size(here.coefficients) or float(-slope @ step) <= _PROMISE


def stepped(anchor: Anchor, target: Target) -> Array:
    """Return where the draws of one pair of evidences lead.

    Args:
        anchor: the pair, under some distortion.
        target: threshold and range.

    Returns:
        (term,) the smallest distortion that meets the threshold as far as the draws tell, or where they end.
    """
    here = anchor.trial(anchor.coefficients)
    here = _crossing(anchor, here, here, target)
    for _ in range(_MOST_STEPS):
        steepness = _size(here.slope)
        if steepness < _LEAST_SLOPE:
            break
        goal = _goal(here, target)
        if _size(goal - here.coefficients) < _ARRIVED * max(_size(goal), target.within * 0.01):
            break
        rate = 4.0 * max(_size(here.coefficients), _size(goal)) / steepness
        if _size(goal) >= target.within * (1.0 - 1e-9):
            rate *= 10.0
        further = _shortened(anchor, here, goal, rate, target)
        if further is None:
            break
        here = _crossing(anchor, here, further, target)
    return here.coefficients


def _goal(here: Trial, target: Target) -> Array:
    slope, steepness = here.slope, _size(here.slope)
    along = float(slope @ here.coefficients) - (here.ln_bayes_factor - target.below)
    goal = along * slope / steepness**2
    return goal if _size(goal) <= target.within else -target.within * slope / steepness


def _shortened(anchor: Anchor, here: Trial, goal: Array, rate: float, target: Target) -> Trial | None:
    """Return the longest of the halved steps towards a goal that is an improvement."""
    share, now = 1.0, _merit(here, rate, target)
    while share >= _SHORTEST:
        further = anchor.trial(here.coefficients + share * (goal - here.coefficients))
        if further.is_reliable and _merit(further, rate, target) < now:
            return further
        share *= 0.5
    return None


def _crossing(anchor: Anchor, here: Trial, further: Trial, target: Target) -> Trial:
    """Return where ln B meets the threshold on the way to a trial that lies beyond it, else that trial.

    Beyond, ln B may be rising again, and its slope leads nowhere.
    """
    if further.ln_bayes_factor >= target.below - _CLOSE:
        return further
    is_above = here.ln_bayes_factor > target.below
    above = here.coefficients if is_above else np.zeros_like(here.coefficients)
    beyond = further
    for _ in range(_HALVINGS):
        middle = anchor.trial(0.5 * (above + beyond.coefficients))
        if middle.ln_bayes_factor > target.below:
            above = middle.coefficients
        else:
            beyond = middle
            if beyond.ln_bayes_factor > target.below - _CLOSE:
                break
    return beyond


def _merit(trial: Trial, rate: float, target: Target) -> float:
    size = _size(trial.coefficients)
    return 0.5 * size**2 + rate * max(0.0, trial.ln_bayes_factor - target.below)


def _size(coefficients: Array) -> float:
    return float(np.linalg.norm(coefficients))
