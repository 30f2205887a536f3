"""The local p-value of a signal, from the profile likelihood."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np
from scipy import special

from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.priors import Uniform
from workbench.likelihood.fit import fit
from workbench.likelihood.results import Ending, Fit

_USABLE = (Ending.CONVERGED, Ending.AT_LIMIT, Ending.FLAT)


@dataclass(frozen=True, slots=True)
class LocalP:
    """One-sided discovery p-value at the best place of the signal.

    Attributes:
        statistic: q0 = 2 (ln L at the best strength - ln L without signal), 0 for a deficit.
        p: its asymptotic tail probability; 0 where double precision has none so small.
        ln_p: ln of it.
        at: fitted signal parameters by name.
    """

    statistic: float
    p: float
    ln_p: float
    at: Mapping[str, float]


def local_p(analysis: Analysis, hypothesis: str, against: str, strength: str, reach: float) -> LocalP | None:
    """Return the asymptotic local p-value of a hypothesis that is the other one with a signal added.

    p = 1 - Phi(sqrt(q0)), with every likelihood at its penalised maximum

    Args:
        analysis: everything declared, with observed counts.
        hypothesis: the hypothesis with the signal.
        against: the one without it.
        strength: the strength, free from 0 to `reach` whatever its prior.
        reach: a strength beyond what the counts allow.

    Returns:
        The p-value; None where the hypotheses differ by more than this signal or a fit gave nothing to use.

    Limits:
        Asymptotic: for counts of a few events the law of q0 is another. Local: where a mass was searched for,
        p is that of the best mass alone.

    Source:
        G. Cowan, K. Cranmer, E. Gross, O. Vitells, Eur. Phys. J. C 71 (2011) 1554, equations 12 and 52; from
        memory.
    """
    if not differs_by(analysis, hypothesis, against, strength):
        return None
    freed = tuple(
        replace(one, prior=Uniform(0.0, reach)) if one.name == strength else one
        for one in analysis.parameters
    )
    with_signal = fit(replace(analysis, parameters=freed), hypothesis, asymmetric=False)
    without = fit(analysis, against, asymmetric=False)
    if not all(_is_usable(one) for one in (with_signal, without)):
        return None
    statistic = max(2.0 * (with_signal.penalised - without.penalised), 0.0)
    at = {one.name: one.value for one in with_signal.fitted if one.role == "signal"}
    ln_p = float(special.log_ndtr(-np.sqrt(statistic)))
    return LocalP(statistic, float(np.exp(ln_p)), ln_p, at)


def differs_by(analysis: Analysis, hypothesis: str, against: str, strength: str) -> bool:
    """Tell whether a hypothesis at strength 0 is the other one.

    Args:
        analysis: everything declared.
        hypothesis: the hypothesis with the signal.
        against: the other one.
        strength: the signal's strength.
    """
    first, second = analysis.hypothesis(against), analysis.hypothesis(hypothesis)
    added = {name for name in second.processes if strength in analysis.process(name).factors}
    kept = [name for name in second.processes if name not in added]
    used = set(analysis.parameters_used(against)) | set(first.fix)
    held = {name: value for name, value in second.fix.items() if name in used}
    same_shape = first.distortion == second.distortion
    return sorted(kept) == sorted(first.processes) and held == dict(first.fix) and same_shape


def _is_usable(found: Fit) -> bool:
    return found.ending in _USABLE and bool(np.isfinite(found.penalised))
