"""How evidence builds up: odds, strength and adequacy of the counts accumulated so far, at each exposure.

Each step weighs all counts up to its exposure with the priors as they were before any. By the chain rule that
is what updating period by period comes to,

    ln Z(all counts so far) = sum over periods of ln p(period's counts | counts before),

because each factor has the parameters' posterior of the periods before in it. A product of Bayes factors of
single periods, each with the prior set back, is another number and no Bayes factor of anything.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field, replace
from itertools import pairwise

import numpy as np

from workbench.ensembles.adequacy import adequacy
from workbench.ensembles.results import Adequacy
from workbench.ensembles.strengths import StrengthEstimate, strength_estimates
from workbench.errors import InputError, Problem
from workbench.evidence.averaging import likeliest
from workbench.evidence.odds import compare, posteriors
from workbench.evidence.results import Comparison, Evidence, Posterior
from workbench.evidence.weigh import Weighed, weigh, weigh_hypothesis
from workbench.hypotheses.alternatives import in_doubt, variants_of
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.frozen import FrozenMapping
from workbench.likelihood.model import compile_model

Modes = Mapping[str, Mapping[str, float]]

_FEW = 200


@dataclass(frozen=True, slots=True)
class Step:
    """What the counts accumulated up to an exposure say.

    Attributes:
        exposure: accumulated so far.
        events: counted so far, all regions together [events].
        evidences: one a hypothesis, each of all counts so far.
        posteriors: one a hypothesis.
        comparisons: every hypothesis but the first, against the first.
        strengths: one a strength and hypothesis; none where its evidence is not established.
        adequacies: one a hypothesis; none where they were not asked for.
    """

    exposure: float
    events: float
    evidences: tuple[Evidence, ...]
    posteriors: tuple[Posterior, ...]
    comparisons: tuple[Comparison, ...]
    strengths: tuple[StrengthEstimate, ...]
    adequacies: tuple[Adequacy, ...]


@dataclass(frozen=True, slots=True)
class BuildUp:
    """The steps so far, in order of exposure.

    Attributes:
        steps: one an exposure.
        unit: of the exposure.
        seed: where every random number of the calculation comes from.
        modes: hypothesis to where its last maximum was, in standard coordinates, for the next step to start.
    """

    steps: tuple[Step, ...]
    unit: str
    seed: int
    modes: Modes = field(default=FrozenMapping({}), repr=False)

    def of(self, hypothesis: str) -> tuple[Comparison, ...]:
        """Return the comparisons of a hypothesis with the first, one a step.

        Args:
            hypothesis: its name; not the first.
        """
        return tuple(one for step in self.steps for one in step.comparisons if one.hypothesis == hypothesis)


def build_up(
    accumulated: Callable[[float], Analysis],
    exposures: Sequence[float],
    *,
    seed: int = 1,
    pseudo_experiments: int = _FEW,
) -> BuildUp:
    """Return how the evidence builds up with exposure.

    Args:
        accumulated: gives the analysis of all counts up to an exposure, such as a toy's `at`.
        exposures: ascending, > 0.
        seed: where every random number of the calculation comes from.
        pseudo_experiments: the most for each adequacy; 0 leaves adequacy out.

    Returns:
        The steps; one step is the same whichever others are asked for, up to its numerical error.

    Raises:
        InputError: for exposures that don't ascend, or counts that can't be weighed.

    Source:
        Chain rule of probability; H. Jeffreys, Theory of Probability (3rd ed., 1961), section 1.2; from
        memory.
    """
    steps = build_up_steps(accumulated, exposures, seed=seed, pseudo_experiments=pseudo_experiments)
    return list(steps)[-1] if len(exposures) else BuildUp((), "", seed)


def build_up_steps(
    accumulated: Callable[[float], Analysis],
    exposures: Sequence[float],
    *,
    seed: int = 1,
    pseudo_experiments: int = _FEW,
    before: BuildUp | None = None,
) -> Iterator[BuildUp]:
    """Yield the build-up after each step, so that it can be shown, and stopped, on the way.

    Args:
        accumulated: gives the analysis of all counts up to an exposure.
        exposures: ascending, > 0.
        seed: where every random number of the calculation comes from.
        pseudo_experiments: the most for each adequacy; 0 leaves adequacy out.
        before: steps of the same experiment at smaller exposures, which these go on from.

    Yields:
        All steps so far.

    Raises:
        InputError: for exposures that don't ascend, or counts that can't be weighed.

    Source:
        as `build_up`
    """
    found = BuildUp((), "", seed) if before is None else before
    last = [step.exposure for step in found.steps][-1:]
    _refuse_order([*last, *exposures])
    for exposure in exposures:
        analysis = accumulated(exposure)
        step, modes = _step(analysis, exposure, seed, pseudo_experiments, found.modes)
        unit = "" if analysis.exposure is None else analysis.exposure.unit
        found = replace(found, steps=(*found.steps, step), unit=unit, modes=modes)
        yield found


def _refuse_order(exposures: Sequence[float]) -> None:
    """Refuse exposures that don't ascend; each by itself is refused by what accumulates."""
    if all(one < other for one, other in pairwise(exposures)):
        return
    raise InputError(
        Problem(
            "Exposures that don't ascend",
            "exposures",
            ", ".join(f"{one:g}" for one in exposures[:8]),
            "each above the one before: counts only add up",
            "sort them, each once",
        )
    )


def _step(
    analysis: Analysis, exposure: float, seed: int, pseudo_experiments: int, modes: Modes
) -> tuple[Step, Modes]:
    """Return one step, and where its maxima are."""
    weighing = weigh(analysis, seed=seed) if in_doubt(analysis) else None
    if weighing is None:
        step, modes = _weighed(analysis, exposure, seed, modes)
    else:
        step = _averaged(analysis, exposure, seed, weighing.evidences)
    if pseudo_experiments == 0:
        return step, modes
    judged = tuple(
        adequacy(analysis, one.name, seed=seed, most=pseudo_experiments, weighing=weighing)
        for one in analysis.hypotheses
    )
    return replace(step, adequacies=judged), modes


@np.errstate(all="ignore")  # an impossible point has ln probability -inf
def _weighed(analysis: Analysis, exposure: float, seed: int, modes: Modes) -> tuple[Step, Modes]:
    """Return a step of an analysis without alternatives, each hypothesis started where it ended before."""
    children = np.random.SeedSequence(seed).spawn(len(analysis.hypotheses))
    weighed: list[Weighed] = []
    for hypothesis, child in zip(analysis.hypotheses, children, strict=True):
        first = weighed[0].grid.mode if weighed and weighed[0].grid is not None else {}
        model = compile_model(analysis, hypothesis.name)
        weighed.append(weigh_hypothesis(model, child, near={**modes.get(hypothesis.name, {}), **first}))
    ends = {one.model.hypothesis: FrozenMapping(one.grid.mode) for one in weighed if one.grid is not None}
    evidences = tuple(one.evidence for one in weighed)
    strengths = tuple(
        estimate
        for one, child in zip(weighed, children, strict=True)
        for estimate in strength_estimates(_with_draws(one, child))
    )
    return _compared(analysis, exposure, evidences, strengths), FrozenMapping(ends)


def _averaged(analysis: Analysis, exposure: float, seed: int, evidences: tuple[Evidence, ...]) -> Step:
    """Return a step of an analysis with alternatives, strengths under the likeliest one."""
    children = np.random.SeedSequence(seed).spawn(len(analysis.hypotheses))
    strengths: list[StrengthEstimate] = []
    for evidence, child in zip(evidences, children, strict=True):
        judged = likeliest(variants_of(analysis, evidence.hypothesis), evidence)
        one = weigh_hypothesis(compile_model(judged.analysis, evidence.hypothesis), child, closed_forms=False)
        strengths += strength_estimates(one, judged.name)
    return _compared(analysis, exposure, evidences, tuple(strengths))


def _with_draws(weighed: Weighed, seed: np.random.SeedSequence) -> Weighed:
    """Return a hypothesis with draws, also where a closed form needed none."""
    has_strength = any(one.is_strength for one in weighed.model.coordinates)
    if weighed.sample is not None or not has_strength or not weighed.evidence.established:
        return weighed
    return weigh_hypothesis(weighed.model, seed, closed_forms=False)


def _compared(
    analysis: Analysis,
    exposure: float,
    evidences: tuple[Evidence, ...],
    strengths: tuple[StrengthEstimate, ...],
) -> Step:
    priors = np.array([one.prior for one in analysis.hypotheses], dtype=float)
    counted = [region.table.observed for region in analysis.regions if region.table.observed is not None]
    return Step(
        exposure,
        float(sum(counts.sum() for counts in counted)),
        evidences,
        posteriors(evidences, priors / priors.sum()),
        tuple(
            compare(evidence, evidences[0], float(prior / priors[0]))
            for evidence, prior in zip(evidences[1:], priors[1:], strict=True)
        ),
        strengths,
        (),
    )
