"""A search for several narrow peaks at once, and its evidences by brute force; invented.

The brute force has its own counts expected, its own Poisson law and its own sum: none of it is the engine's.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
from scipy import special

from tests.evidence.small_analyses import evenly
from workbench.counts.region import Region
from workbench.counts.table import Table
from workbench.hypotheses.analysis import Analysis, Hypothesis, Parameter
from workbench.hypotheses.priors import Exponential, Uniform
from workbench.hypotheses.processes import Contribution, Process
from workbench.hypotheses.shapes import Falling, Gaussian

Array = npt.NDArray[np.float64]

EVENTS = 20.0  # of a resonance of strength 1
CONTINUUM = 300.0
SCALE = 8.0
RESOLUTION = 0.5
RANGE = (0.0, 20.0)
SEARCHED = (1.0, 19.0)


def resonances(counts: Array, most: int) -> Analysis:
    """Return hypotheses with none, one, two ... resonances of unknown strengths and masses.

    Each further resonance is taken to be half as probable: the prior of how many there are.
    """
    table = Table(evenly(*RANGE, len(counts)), np.asarray(counts, dtype=float))
    parameters: list[Parameter] = []
    continuum = Contribution(Falling(SCALE), CONTINUUM)
    processes = [Process("continuum", "background", {"spectrum": continuum})]
    hypotheses = [Hypothesis("none", ("continuum",), 1.0)]
    for number in range(1, most + 1):
        parameters += [
            Parameter(f"strength {number}", Exponential(1.0)),
            Parameter(f"mass {number}", Uniform(*SEARCHED)),
        ]
        peak = Contribution(Gaussian(f"mass {number}", RESOLUTION), EVENTS)
        processes.append(
            Process(f"peak {number}", "signal", {"spectrum": peak}, factors=(f"strength {number}",))
        )
        name = "1 resonance" if number == 1 else f"{number} resonances"
        hypotheses.append(Hypothesis(name, tuple(one.name for one in processes), 0.5**number))
    return Analysis(
        title="Several resonances",
        regions=(Region("spectrum", table),),
        parameters=tuple(parameters),
        processes=tuple(processes),
        hypotheses=tuple(hypotheses),
    )


def expected(bins: int, *peaks: tuple[float, float]) -> Array:
    """Return (bin,) events of the continuum and of peaks, (mass, events) each."""
    edges = np.linspace(*RANGE, bins + 1)
    total = CONTINUUM * -np.diff(np.exp(-edges / SCALE)) / -np.expm1(-RANGE[1] / SCALE)
    for mass, events in peaks:
        total = total + events * np.diff(special.ndtr((edges - mass) / RESOLUTION))
    return np.asarray(total)


def ln_evidences(counts: Array) -> tuple[float, float, float]:
    """Return the ln evidences of no, one and two resonances, by sums over masses and strengths.

    Masses: 160 midpoints over the searched range, a quarter of the resolution apart. Strengths:
    Gauss-Legendre panels under the exponential prior. Two resonances: each pair of masses stands for both of
    its orders.
    """
    counts = np.asarray(counts, dtype=float)
    base = expected(len(counts))
    step = (SEARCHED[1] - SEARCHED[0]) / 160
    masses = SEARCHED[0] + step * (np.arange(160) + 0.5)
    shapes = np.stack([expected(len(counts), (mass, EVENTS)) - base for mass in masses])
    node, weight = np.polynomial.legendre.leggauss(9)
    ends = np.array([0.0, 1.0, 3.0, 8.0])
    low, half = ends[:-1, None], 0.5 * np.diff(ends)[:, None]
    strength = (low + half * (1.0 + node)).ravel()
    ln_strength = np.log((half * weight).ravel()) - strength
    constant = -special.gammaln(counts + 1.0).sum()

    def ln_probability(mean: Array) -> Array:
        return np.asarray(np.log(mean) @ counts - mean.sum(axis=-1) + constant)

    signal = strength[:, None, None] * shapes  # (strength, mass, bin)
    ln_mass = -np.log(160.0)
    one = ln_probability(base + signal) + ln_strength[:, None] + ln_mass
    pairs = []
    for s, first in enumerate(signal):
        for t, second in enumerate(signal):
            for place in range(160):
                # The second mass from the first one on: equal pairs once, the others twice.
                value = ln_probability(base + first[place] + second[place:])
                twice = np.full(160 - place, np.log(2.0))
                twice[0] = 0.0
                value = value + twice + ln_strength[s] + ln_strength[t] + 2.0 * ln_mass
                pairs.append(special.logsumexp(value))
    return (
        float(ln_probability(base)),
        float(special.logsumexp(one)),
        float(special.logsumexp(pairs)),
    )
