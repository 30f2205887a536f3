"""Alternatives of backgrounds built by hand, for screens, records and pictures; none was computed."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from tests.records import hand_built as hand
from workbench.errors import Caution
from workbench.evidence.backgrounds import AVERAGE, Backgrounds, Fake
from workbench.evidence.results import AlternativeEvidence, AlternativeFactor, Estimate, Evidence, Weighing
from workbench.evidence.spurious import FakedStrength
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.parameters import Parameter
from workbench.hypotheses.priors import Normal
from workbench.hypotheses.processes import Alternative, Contribution
from workbench.hypotheses.shapes import Falling, PowerLaw, Shape
from workbench.records.outcomes import BackgroundsOutcome, FitOutcome, WeighOutcome

FALLING, POWER = "falling", "power law with a long name"
NAMES, PRIORS = (FALLING, POWER), (0.75, 0.25)


def analysis() -> Analysis:
    """Return the analysis at Tern with two alternatives of its continuum."""
    given = hand.analysis()
    shapes: tuple[Shape, ...] = (Falling("continuum scale"), PowerLaw("index"))
    alternatives = tuple(
        Alternative(name, {"peak": Contribution(shape, 300.0)}, prior)
        for name, shape, prior in zip(NAMES, shapes, (3.0, 1.0), strict=True)
    )
    continuum = replace(given.processes[0], regions={}, alternatives=alternatives)
    return replace(
        given,
        parameters=(*given.parameters, Parameter("index", Normal(2.0, 0.5, low=0.0))),
        processes=(continuum, *given.processes[1:]),
    )


def weighing() -> Weighing:
    """Return a weighing whose evidences are averages of two."""
    given = hand.weighing()
    first, second = (
        _averaged(evidence, posteriors)
        for evidence, posteriors in zip(given.evidences, ((0.98, 0.02), (0.6, 0.4)), strict=True)
    )
    alone = (
        AlternativeFactor(FALLING, 0.75, 7.21, 0.006, True),
        AlternativeFactor(POWER, 0.25, 10.71, 0.007, True),
    )
    comparison = replace(given.comparisons[0], alternatives=alone)
    return replace(given, evidences=(first, second), comparisons=(comparison,))


def _averaged(evidence: Evidence, posteriors: tuple[float, float]) -> Evidence:
    value, error = evidence.ln_evidence or 0.0, evidence.error or 0.0
    parts = []
    for name, prior, posterior in zip(NAMES, PRIORS, posteriors, strict=True):
        own = value + float(np.log(posterior / prior))
        estimates = (
            Estimate("Laplace", own + 0.001, 0.02, None, 1),
            Estimate("sampling", own, error, 0.1, 1024),
        )
        parts.append(
            AlternativeEvidence(
                name, prior, Evidence(evidence.hypothesis, own, error, True, "", estimates), posterior, 0.0021
            )
        )
    average = (Estimate("average", value, error, 0.1, 2048),)
    return replace(evidence, estimates=average, alternatives=tuple(parts))


def found() -> Backgrounds:
    """Return what `backgrounds` would find."""
    sizes = {
        (FALLING, FALLING): (-0.01, -1.9),
        (FALLING, POWER): (0.62, 0.4),
        (FALLING, AVERAGE): (None, -1.7),
        (POWER, FALLING): (-0.44, -2.9),
        (POWER, POWER): (0.004, -2.0),
        (POWER, AVERAGE): (None, -2.1),
    }
    fakes = tuple(
        Fake(truth, fitted, () if size is None else (_strength(size),), ln_b, 0.005, True)
        for (truth, fitted), (size, ln_b) in sizes.items()
    )
    return Backgrounds(
        hand.RESONANCE,
        hand.BACKGROUND,
        NAMES,
        PRIORS,
        weighing(),
        np.array([hand.CONTINUUM, 0.98 * hand.CONTINUUM]),
        True,
        fakes,
        1,
        (Caution("spurious-signal", 'Fitted with "falling", something is faked.'),),
    )


def _strength(value: float) -> FakedStrength:
    return FakedStrength("strength", value, 0.31, 20.0 * value, 6.2, (("mass", 50.04),))


def outcome(given: Backgrounds | None = None) -> BackgroundsOutcome:
    """Return what the command would hand over."""
    return BackgroundsOutcome(analysis(), hand.ORIGIN, found() if given is None else given)


def planned() -> BackgroundsOutcome:
    """Return the same before anything was observed."""
    region = analysis().regions[0]
    bare = replace(region, table=replace(region.table, observed=None))
    given = replace(found(), weighing=None, is_fitted=False)
    return replace(outcome(given), analysis=replace(analysis(), regions=(bare,)))


def unestablished() -> Backgrounds:
    """Return the same where one alternative's evidence is not established."""
    given = weighing()
    reason = 'with "falling", k-hat is 0.83, above 0.70'
    doubted, other = given.evidences[0].alternatives
    own = replace(doubted.evidence, established=False, reason="k-hat is 0.83, above 0.70")
    alternatives = (replace(doubted, evidence=own, posterior=None), replace(other, posterior=None))
    first = replace(given.evidences[0], established=False, reason=reason, alternatives=alternatives)
    comparison = replace(given.comparisons[0], established=False)
    alone = (replace(comparison.alternatives[0], established=False), comparison.alternatives[1])
    doubtful = replace(
        given, evidences=(first, given.evidences[1]), comparisons=(replace(comparison, alternatives=alone),)
    )
    fakes = tuple(replace(one, established=one.fitted != FALLING) for one in found().fakes)
    return replace(found(), weighing=doubtful, fakes=fakes)


def weighed() -> WeighOutcome:
    """Return what `weigh` would hand over."""
    judged = tuple(replace(one, alternative=FALLING) for one in hand.adequacies())
    return replace(hand.weighed(weighing(), judged), analysis=analysis(), fits=fitted().fits)


def fitted() -> FitOutcome:
    """Return what `fit` would hand over."""
    fits = tuple(
        replace(
            fit, alternative=FALLING, others=(replace(fit, alternative=POWER, penalised=fit.penalised - 1.5),)
        )
        for fit in hand.fits()
    )
    return replace(hand.fitted(), analysis=analysis(), fits=fits)
