"""The case that is examined: two hypotheses weighed, and the strength whose prior is asked about."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace

import numpy as np

from workbench.errors import InputError, Problem, nearest, quoted
from workbench.evidence.averaging import likeliest
from workbench.evidence.odds import compare
from workbench.evidence.prior_choice.power_scaling import Draws, draws_of, power_scaling
from workbench.evidence.prior_choice.powers import PowerScaling
from workbench.evidence.results import Comparison, Evidence
from workbench.evidence.weigh import Weighed, weigh, weigh_hypothesis
from workbench.hypotheses.alternatives import in_doubt, variants_of
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.hypothesis import Hypothesis
from workbench.likelihood.coordinates import coordinates_of
from workbench.likelihood.model import compile_model

Say = Callable[[str], None]


@dataclass(frozen=True, slots=True)
class Case:
    """Two hypotheses weighed, and a strength of the second.

    Attributes:
        analysis: everything declared.
        strength: the parameter's name.
        against, weighed: the two hypotheses; where backgrounds have alternatives, under the likeliest.
        evidences: theirs, the first hypothesis' first; averages over the alternatives where there are some.
        comparison: the second against the first.
        alternative: the alternative that `against` and `weighed` are under; empty without any.
        seeds: where their random numbers came from.
    """

    analysis: Analysis
    strength: str
    against: Weighed
    weighed: Weighed
    evidences: tuple[Evidence, Evidence]
    comparison: Comparison
    alternative: str
    seeds: tuple[np.random.SeedSequence, np.random.SeedSequence]

    def doubt(self) -> str:
        """Return why one of the evidences is not established; empty when both are."""
        for evidence in self.evidences:
            if not evidence.established or evidence.ln_evidence is None:
                return f"{quoted(evidence.hypothesis)}: {evidence.reason}"
        return ""

    def power_scalings(self, say: Say) -> tuple[PowerScaling, ...]:
        """Return every nuisance prior of the second hypothesis to powers."""
        first, second = (
            self._draws(one, seed, say)
            for one, seed in zip((self.against, self.weighed), self.seeds, strict=True)
        )
        return () if second is None else power_scaling(second, first, say)

    def _draws(self, one: Weighed, seed: np.random.SeedSequence, say: Say) -> Draws | None:
        """Return a hypothesis' draws, made for this where its evidence came in closed form."""
        if one.sample is None and one.model.size:
            say(f"draws of {one.model.hypothesis}")
            one = weigh_hypothesis(one.model, _fresh(seed), closed_forms=False)
        return draws_of(one, _fresh(seed))


def _fresh(seed: np.random.SeedSequence) -> np.random.SeedSequence:
    return np.random.SeedSequence(seed.entropy, spawn_key=seed.spawn_key)


def weighed_case(
    analysis: Analysis, hypothesis: str | None, parameter: str | None, seed: int, say: Say
) -> Case:
    """Weigh a hypothesis against the first of the analysis, to the numbers that `weigh` has.

    Args:
        analysis: everything declared, with observed counts.
        hypothesis: its name; None takes the first after the first that has a strength.
        parameter: the strength's name; None takes the hypothesis' first.
        seed: where every random number comes from.
        say: told how it goes on.

    Raises:
        InputError: if a region has no observed counts, or there is no such hypothesis or strength.
    """
    name, strength = _chosen(analysis, hypothesis, parameter)
    names = [one.name for one in analysis.hypotheses]
    children = np.random.SeedSequence(seed).spawn(len(names))
    if in_doubt(analysis):
        return _averaged_case(analysis, name, strength, seed, say)
    found: list[Weighed] = []
    for one, child in ((names[0], children[0]), (name, children[names.index(name)])):
        say(f"weighing {one}")
        near: Mapping[str, float] = found[0].grid.mode if found and found[0].grid is not None else {}
        found.append(weigh_hypothesis(compile_model(analysis, one), child, near=near))
    priors = {one.name: one.prior for one in analysis.hypotheses}
    evidences = (found[0].evidence, found[1].evidence)
    comparison = compare(evidences[1], evidences[0], priors[name] / priors[names[0]])
    seeds = (children[0], children[names.index(name)])
    return Case(analysis, strength, found[0], found[1], evidences, comparison, "", seeds)


def _averaged_case(analysis: Analysis, name: str, strength: str, seed: int, say: Say) -> Case:
    """Weigh averages over the alternatives of backgrounds; the likeliest alternative stands for its parts."""
    say("weighing every alternative of the backgrounds")
    weighing = weigh(analysis, seed=seed)
    first = analysis.hypotheses[0].name
    evidences = (weighing.evidence_of(first), weighing.evidence_of(name))
    variant = likeliest(variants_of(analysis, name), evidences[1])
    say(f"weighing {name} with {variant.name}")
    plain = replace(variant.analysis, hypotheses=tuple(_pair(variant.analysis, first, name)))
    if in_doubt(plain):  # what the first hypothesis alone uses
        plain = likeliest(variants_of(plain), evidences[0]).analysis
    case = weighed_case(plain, name, strength, seed, say)
    comparison = next(one for one in weighing.comparisons if one.hypothesis == name)
    return replace(
        case, analysis=analysis, evidences=evidences, comparison=comparison, alternative=variant.name
    )


def _pair(analysis: Analysis, first: str, second: str) -> list[Hypothesis]:
    return [one for one in analysis.hypotheses if one.name in {first, second}]


def strengths_of(analysis: Analysis, hypothesis: str) -> tuple[str, ...]:
    """Return the free strengths of a hypothesis, in declaration order."""
    plain = variants_of(analysis, hypothesis)[0].analysis
    return tuple(one.name for one in coordinates_of(plain, hypothesis) if one.is_strength)


def _chosen(analysis: Analysis, hypothesis: str | None, parameter: str | None) -> tuple[str, str]:
    """Return the hypothesis and the strength asked for, or say what there is."""
    others = [one.name for one in analysis.hypotheses[1:]]
    strengths = {name: strengths_of(analysis, name) for name in others}
    able = [name for name in others if strengths[name]]
    if not able:
        raise InputError(
            Problem(
                "No strength whose prior could be examined",
                "the hypotheses after the first",
                ", ".join(quoted(name) for name in others) or "none",
                "one with a free signal parameter that only multiplies yields",
                "add a hypothesis with a signal whose factors name a parameter",
            )
        )
    name = able[0] if hypothesis is None else hypothesis
    if name not in able:
        raise InputError(
            Problem(
                "No such hypothesis with a strength",
                "the hypothesis that was asked for",
                quoted(name),
                "one of: " + ", ".join(quoted(one) for one in able),
                nearest(name, able),
            )
        )
    strength = strengths[name][0] if parameter is None else parameter
    if strength not in strengths[name]:
        raise InputError(
            Problem(
                "No such strength",
                f"the strength that was asked for, of {quoted(name)}",
                quoted(strength),
                "one of: " + ", ".join(quoted(one) for one in strengths[name]),
                nearest(strength, strengths[name]),
            )
        )
    return name, strength
