"""An examination of priors built by hand on the curve of one count, for screens, records and pictures."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np

from tests.evidence.prior_choice.curves import counted, curve_of
from tests.records import hand_built as hand
from workbench.errors import Caution
from workbench.evidence.formulas.scales import JEFFREYS, KASS_RAFTERY
from workbench.evidence.prior_choice.averages import Average, average
from workbench.evidence.prior_choice.bounds import (
    Bound,
    largest_never_rising,
    largest_of_any,
    largest_with_peak,
)
from workbench.evidence.prior_choice.families import Family, families
from workbench.evidence.prior_choice.local_p import LocalP
from workbench.evidence.prior_choice.powers import Driver, PowerChange, PowerScaling
from workbench.evidence.prior_choice.reference import ReferenceFamily
from workbench.evidence.prior_choice.results import DeclaredPrior, PriorSensitivity
from workbench.evidence.prior_choice.verdicts import Crossing, FamilyCurve, crossings, needed_prior
from workbench.hypotheses.priors import Uniform
from workbench.records.outcomes import PriorsOutcome

OBSERVED, BACKGROUND, YIELD = 21.0, 9.0, 12.0


def scalings() -> tuple[PowerScaling, ...]:
    """Return one nuisance prior of each kind."""
    kinds = (
        ("continuum scale", 0.021, 0.094, 0.6, Driver.DATA, -0.031, 0.044, False),
        ("continuum normalisation", 0.043, 0.046, -0.7, Driver.BOTH, -0.120, 0.131, False),
        ("muon efficiency", 0.083, 0.004, None, Driver.PRIOR, 0.002, -0.001, False),
        ("fake composition", 0.141, 0.102, 2.6, Driver.CONFLICT, 1.204, -1.377, True),
        ("level", 0.0, 0.101, None, Driver.FLAT, 0.0, 0.0, False),
    )
    return tuple(
        PowerScaling(
            name,
            "source",
            "normal 0 ± 1",
            by_prior,
            0.002,
            by_data,
            0.004,
            tension,
            driver,
            (
                PowerChange(0.5, wider, 0.006 if wider else 0.0, 0.81 if is_fresh else 0.2, is_fresh),
                PowerChange(2.0, narrower, 0.004 if narrower else 0.0, 0.1, False),
            ),
        )
        for name, by_prior, by_data, tension, driver, wider, narrower, is_fresh in kinds
    )


def examination(
    observed: float = OBSERVED, background: float = BACKGROUND, yields: float = YIELD
) -> PriorSensitivity:
    """Return an examination of a count on a known background; only the nuisance priors are invented."""
    prior = Uniform(0.0, 5.0)
    curve = curve_of(counted(observed, background, yields), 16.0, error=0.003)
    means = 2.5 * 2.0 ** (np.arange(-24, 19) / 6.0)
    strengths = np.concatenate([[0.0], np.geomspace(1e-6, 200.0, 2000)])
    integral = 2.0 * (np.sqrt(strengths + background / yields) - np.sqrt(background / yields))
    made = families(ReferenceFamily(strengths, integral))
    curves = tuple(
        FamilyCurve(one.name, one.words, tuple(average(curve, one.member(float(mean))) for mean in means))
        for one in made
    )
    by_curve = average(curve, prior)
    ln_b = by_curve.ln_bayes_factor or 0.0
    given = hand.weighing(ln_b)
    bounds = (
        largest_of_any(curve),
        largest_with_peak(curve, 1.0),
        largest_never_rising(curve),
        Bound("p-value", 4.36, 0.0),
    )

    def crossed(family: Family, known: FamilyCurve, name: str) -> tuple[Crossing, ...]:
        scale = {KASS_RAFTERY.name: KASS_RAFTERY, JEFFREYS.name: JEFFREYS}[name]
        return crossings(
            family.name, means, known.averages, scale, lambda mean: average(curve, family.member(mean))
        )

    return PriorSensitivity(
        strength="strength",
        comparison=replace(given.comparisons[0], sensitivity=()),
        evidences=(given.evidences[0], given.evidences[1]),
        reason="",
        declared=DeclaredPrior(prior.text(), prior.family, prior.moments.mean, by_curve),
        events=yields,
        curve=curve,
        means=means,
        families=curves,
        bounds=bounds,
        local=LocalP(9.61, 0.00097, math.log(0.00097), {"strength": 1.0, "mass": 50.0}),
        crossings={
            name: tuple(c for one, known in zip(made, curves, strict=True) for c in crossed(one, known, name))
            for name in (KASS_RAFTERY.name, JEFFREYS.name)
        },
        posterior=0.99,
        needed=tuple(
            needed_prior(name, value, 0.005, 0.99)
            for name, value in (
                ("as declared", ln_b),
                *((one.name, one.ln_bayes_factor) for one in bounds[:3]),
            )
        ),
        scalings=scalings(),
        seed=1,
        cautions=(Caution("averaged", 'Every number here is averaged over the stated prior of "mass".'),),
    )


def unestablished() -> PriorSensitivity:
    """Return one of which nothing can be said."""
    given, found = hand.unestablished(), examination()
    return replace(
        found,
        comparison=given.comparisons[0],
        evidences=(given.evidences[0], given.evidences[1]),
        reason=f'"resonance": {given.evidences[1].reason}',
        declared=replace(found.declared, by_curve=Average(None, None)),
        curve=None,
        means=np.zeros(0),
        families=(),
        bounds=(),
        local=None,
        crossings={},
        needed=(),
        scalings=(),
        cautions=(),
    )


def examined(found: PriorSensitivity | None = None, fails: bool = False) -> PriorsOutcome:
    """Return what `priors` would hand over."""
    adequacies = hand.adequacies(0.0005, 0.0005) if fails else hand.adequacies()
    return PriorsOutcome(hand.analysis(), hand.ORIGIN, found or examination(), adequacies)
