"""Updating ratios built by hand: a Gaussian peak in strength and mass; none was computed from counts."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import numpy.typing as npt

from tests.records import hand_built as hand
from workbench.evidence.ratio.panels import Panels
from workbench.evidence.ratio.results import Check, Scan
from workbench.evidence.ratio.strengths import Strengths
from workbench.evidence.ratio.surface import Surface
from workbench.hypotheses.priors import Fixed, Prior, Uniform
from workbench.records.outcomes import ReadingOutcome, ScanOutcome

Array = npt.NDArray[np.float64]

MASS = Panels("mass", "GeV", np.linspace(25.0, 75.0, 9))
PRIORS: dict[str, Prior] = {"strength": Uniform(0.0, 5.0), "mass": Uniform(25.0, 75.0)}
UNITS = {"strength": "", "mass": "GeV"}
DEPTH = 9.0  # nats that the peak rises above R = 1


def ln_ratio(strength: Array, mass: Array) -> Array:
    """Return 2 a s - s^2 times 9/2.25, a the part of the signal that a peak at 46.3 of width 3 shares."""
    alike = np.exp(-0.25 * ((mass - 46.3) / 3.0) ** 2)
    return DEPTH / 2.25 * (3.0 * alike * strength - strength**2)


def strengths(columns: int) -> Strengths:
    """Return strength nodes from 0 to 10, the same in all columns."""
    one = np.ones(columns)
    return Strengths("strength", 0.0, 10.0, 2.0 * one, 1.2 * one, 0.5 * one, 23)


def surface() -> Surface:
    """Return R over strength and mass."""
    columns = MASS.nodes.size
    laid = strengths(columns)
    values = ln_ratio(laid.nodes, MASS.nodes[:, None])
    error = 0.004 * np.sqrt(laid.nodes)
    return Surface((MASS,), laid, values, error)


def scan() -> Scan:
    """Return a scan over both parameters."""
    checks = (
        Check({"mass": 45.1, "strength": 1.4}, 8.02, 0.005, 8.015, 0.004),
        Check({"mass": 60.2, "strength": 0.3}, -0.31, 0.002, -0.305, 0.004),
    )
    return Scan(
        hand.RESONANCE,
        hand.BACKGROUND,
        ("strength", "mass"),
        surface(),
        PRIORS,
        {},
        UNITS,
        0.5,
        True,
        4.331,
        0.005,
        True,
        "",
        1,
        256,
        checks,
    )


def over_mass() -> Scan:
    """Return a scan over the mass, the strength averaged over its prior."""
    values = 0.5 * ln_ratio(np.array(1.5), MASS.nodes[:, None]) - 1.0
    averaged = Surface((MASS,), None, values, np.full_like(values, 0.006))
    given = scan()
    return replace(
        given,
        over=("mass",),
        surface=averaged,
        priors={"mass": PRIORS["mass"]},
        averaged={"strength": PRIORS["strength"]},
    )


def over_strength() -> Scan:
    """Return a scan over the strength, at a mass that is held."""
    laid = strengths(1)
    given = Surface((), laid, ln_ratio(laid.nodes, np.array(46.3)), 0.004 * np.sqrt(laid.nodes))
    return replace(scan(), over=("strength",), surface=given, priors={"strength": PRIORS["strength"]})


def unestablished() -> Scan:
    """Return a scan that a direct evaluation contradicts."""
    reason = "ln R at mass 45.1, strength 1.4 differs by 0.4 from a direct evaluation, more than 0.07"
    return replace(scan(), established=False, reason=reason)


def nowhere() -> Scan:
    """Return a scan without a surface."""
    reason = '"background only": no parameter value can produce the events observed in region "peak"'
    return replace(
        scan(),
        surface=None,
        established=False,
        reason=reason,
        checks=(),
        ln_bayes_factor=None,
        ln_bayes_factor_error=None,
    )


def outcome(found: Scan | None = None) -> ScanOutcome:
    """Return what `scan` would hand over."""
    given = scan() if found is None else found
    options = {"over": ", ".join(given.over), "hypothesis": given.hypothesis}
    return ScanOutcome(hand.analysis(), replace(hand.ORIGIN, options=options), given)


def reading(found: Scan | None = None, asked: dict[str, Prior] | None = None) -> ReadingOutcome:
    """Return what `weigh --reprior` would hand over."""
    given = scan() if found is None else found
    priors = {"mass": Uniform(40.0, 50.0)} if asked is None else asked
    return ReadingOutcome(
        "scan.json",
        "sha256:" + "1" * 64,
        "Narrow resonance at Tern",
        "tern.toml",
        given,
        priors,
        given.reprior(priors),
    )


def at(strength: float, mass: float) -> dict[str, Prior]:
    """Return priors that are one point."""
    return {"strength": Fixed(strength), "mass": Fixed(mass)}
