"""The curve of a strength traced: evidences with the strength held, more where the curve bends."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field, replace

import numpy as np
import numpy.typing as npt

from workbench.evidence.averaging import averaged
from workbench.evidence.prior_choice.curve import FLOOR, StrengthCurve, middle, smooth
from workbench.evidence.results import AlternativeEvidence, Evidence
from workbench.evidence.weigh import weigh_hypothesis
from workbench.hypotheses.alternatives import variants_of
from workbench.hypotheses.analysis import Analysis
from workbench.likelihood.model import compile_model

Array = npt.NDArray[np.float64]
Say = Callable[[str], None]

_FIRST = (0.125, 0.25, 0.5, 1.0)
_DOUBLINGS = 24
_MOST_NODES = 72
_ROUNDS = 12
_CLOSE = 0.02  # nats between what a spline foresaw and what was found
_CLOSE_FAR_DOWN = 0.2
_DEEP = -6.0
# A cubic spline gains at least this factor when its spacing is halved.
_GAIN = 8.0
_LEAST_SCALE = 1e-14  # of the reach: nearer to 0 double precision has no strengths left


@dataclass(slots=True)
class _Probe:
    """Evidences of one hypothesis with a strength held, each worked out once.

    Attributes:
        analysis, hypothesis, strength: what is held where.
        base: ln evidence of the other hypothesis [nats].
        seed: where the random numbers of every node come from; the same for all, so that the curve is smooth.
        say: told of each node.
        known: the evidences found, by strength.
        near: where the last one had its mode, by alternative of the backgrounds.
    """

    analysis: Analysis
    hypothesis: str
    strength: str
    base: float
    seed: np.random.SeedSequence
    say: Say
    known: dict[float, Evidence] = field(default_factory=dict)
    near: dict[str, Mapping[str, float]] = field(default_factory=dict)

    def ln_ratio(self, strength: float) -> float:
        """Return ln R [nats]; -inf where the evidence is null."""
        if strength not in self.known:
            self.say(f"strength held at {strength:.3g}")
            self.known[strength] = self._evidence(strength)
        value = self.known[strength].ln_evidence
        return float("-inf") if value is None else value - self.base

    def _evidence(self, strength: float) -> Evidence:
        """Return the evidence with the strength held, averaged over the alternatives of the backgrounds."""
        analysis = held_at(self.analysis, self.hypothesis, self.strength, strength)
        parts = []
        for place, variant in enumerate(variants_of(analysis, self.hypothesis)):
            seed = np.random.SeedSequence(self.seed.entropy, spawn_key=(*self.seed.spawn_key, place))
            model = compile_model(variant.analysis, self.hypothesis)
            weighed = weigh_hypothesis(model, seed, near=self.near.get(variant.name, {}))
            if weighed.grid is not None:
                self.near[variant.name] = weighed.grid.mode
            parts.append(AlternativeEvidence(variant.name, variant.prior, weighed.evidence))
        return averaged(self.hypothesis, parts)

    def nodes(self) -> tuple[Array, Array]:
        """Return the strengths that have an evidence, ascending, with their ln R."""
        strengths = sorted(s for s, evidence in self.known.items() if evidence.ln_evidence is not None)
        return np.array(strengths), np.array([self.ln_ratio(s) for s in strengths])


def held_at(analysis: Analysis, hypothesis: str, name: str, value: float) -> Analysis:
    """Return the analysis with a parameter of one hypothesis held at a number."""
    hypotheses = tuple(
        replace(one, fix={**one.fix, name: value}) if one.name == hypothesis else one
        for one in analysis.hypotheses
    )
    return replace(analysis, hypotheses=hypotheses)


def trace(
    analysis: Analysis,
    hypothesis: str,
    strength: str,
    against: Evidence,
    seed: np.random.SeedSequence,
    is_nested: bool,
    scale: float,
    say: Say = lambda _: None,
) -> StrengthCurve:
    """Return ln R of a strength from 0 to where it is below the floor.

    Each node is an evidence of its own with its own estimators and error; intervals are halved until a cubic
    spline foresees their middle.

    Args:
        analysis: everything declared, with observed counts.
        hypothesis: the hypothesis with the strength.
        strength: the parameter's name.
        against: the evidence that R is taken against; it has a value.
        seed: where every random number comes from.
        scale: the strength at which the signal is as large as the background where it first is.
        is_nested: True where the hypothesis at strength 0 is the other one, so that R is 1 there.
        say: told how it goes on.

    Returns:
        The curve, with nodes also at its largest R.
    """
    probe = _Probe(analysis, hypothesis, strength, against.ln_evidence or 0.0, seed, say)
    if is_nested:
        probe.known[0.0] = replace(against, error=0.0)
    is_ended = _spread(probe, float(analysis.parameter(strength).prior.median))
    scale = max(scale, _LEAST_SCALE * float(max(probe.known)))
    between = _refine(probe, scale)
    strengths, ln_ratio = probe.nodes()
    found = [probe.known[float(s)] for s in strengths]
    return StrengthCurve(
        strengths,
        ln_ratio,
        np.array([evidence.error or 0.0 for evidence in found]),
        np.array([between.get(float(s), 0.0) for s in strengths]),
        against.error or 0.0,
        np.array([evidence.established for evidence in found]),
        tuple(evidence.reason for evidence in found),
        is_ended,
        scale,
    )


def _spread(probe: _Probe, unit: float) -> bool:
    """Probe 0, a unit of strength and its halves, then double until ln R ends; tell whether it did."""
    probe.ln_ratio(0.0)
    for part in _FIRST:
        probe.ln_ratio(part * unit)
    last = unit
    for _ in range(_DOUBLINGS):
        if probe.ln_ratio(last) < FLOOR:
            return True
        last *= 2.0
    return probe.ln_ratio(last) < FLOOR


def _refine(probe: _Probe, scale: float) -> dict[float, float]:
    """Halve intervals until a spline foresees their middles; return what it may still miss at each node."""
    between: dict[float, float] = {}
    strengths, _ = probe.nodes()
    open_ones = list(zip(strengths[:-1].tolist(), strengths[1:].tolist(), strict=True))
    for _ in range(_ROUNDS):
        strengths, values = probe.nodes()
        middles = [middle(low, high, scale) for low, high in open_ones]
        foreseen = smooth(strengths, values, np.array(middles), scale)
        left, missed = [], dict[float, float]()
        for (low, high), centre, guess in zip(open_ones, middles, foreseen.tolist(), strict=True):
            if len(probe.known) >= _MOST_NODES:
                break
            if max(probe.ln_ratio(low), probe.ln_ratio(high)) < FLOOR:
                continue
            value = probe.ln_ratio(centre)
            miss = abs(guess - value)
            noise = 3.0 * (probe.known[centre].error or 0.0)
            for place in (low, centre, high):
                missed[place] = max(missed.get(place, 0.0), max(miss - noise, 0.0) / _GAIN)
            if miss > noise + (_CLOSE if value > _DEEP else _CLOSE_FAR_DOWN):
                left += [(low, centre), (centre, high)]
        between.update(missed)
        open_ones = left
        if not open_ones:
            break
    _add_the_top(probe, scale)
    return between


def _add_the_top(probe: _Probe, scale: float) -> None:
    """Probe where the spline is largest."""
    strengths, values = probe.nodes()
    place = int(np.argmax(values))
    low, high = strengths[max(place - 1, 0)], strengths[min(place + 1, strengths.size - 1)]
    fine = np.linspace(low, high, 401)
    best = float(fine[int(np.argmax(smooth(strengths, values, fine, scale)))])
    probe.ln_ratio(best)
