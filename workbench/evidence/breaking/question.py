"""What is asked of a break point, checked and compiled."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from workbench.errors import InputError, Problem, nearest, quoted
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.distortion import DEFAULT_TERMS, MOST_TERMS
from workbench.likelihood.distortions import filled_bins, region_functions
from workbench.likelihood.model import Model, compile_model

Array = npt.NDArray[np.float64]

LARGEST_WITHIN = 1.0


@dataclass(frozen=True, slots=True, eq=False)
class Question:
    """What is asked, compiled.

    Attributes:
        models: the signal hypothesis and the one that it is compared with, as declared.
        seeds: where the random numbers of each come from.
        regions: region to its bins and its (term, bin) functions.
    """

    models: tuple[Model, Model]
    seeds: tuple[np.random.SeedSequence, np.random.SeedSequence]
    regions: Mapping[str, tuple[slice, Array]]

    @property
    def bins(self) -> npt.NDArray[np.intp]:
        """Return the places of the distorted bins among all."""
        places = np.arange(self.models[0].bins)
        return np.concatenate([places[bins] for bins, _ in self.regions.values()])

    @property
    def functions(self) -> Array:
        """Return the (term, bin) functions of all regions, each 0 outside its own."""
        sizes = [functions.shape for _, functions in self.regions.values()]
        made = np.zeros((sum(terms for terms, _ in sizes), sum(bins for _, bins in sizes)))
        row = column = 0
        for _, functions in self.regions.values():
            terms, bins = functions.shape
            made[row : row + terms, column : column + bins] = functions
            row, column = row + terms, column + bins
        return made

    def factors(self, coefficients: Array) -> Array:
        """Return what multiplies the backgrounds in all bins of the analysis."""
        made = np.ones(self.models[0].bins)
        made[self.bins] = np.exp(coefficients @ self.functions)
        return made


def asked(
    analysis: Analysis,
    below: float,
    hypothesis: str | None,
    terms: int | None,
    regions: Sequence[str] | None,
    within: float,
    seed: int,
) -> Question:
    """Return what `break_point` was asked, compiled, or refuse it with everything that is wrong."""
    name = signal_hypothesis(analysis) if hypothesis is None else analysis.hypothesis(hypothesis).name
    declared = next((one.distortion for one in analysis.hypotheses if one.distortion is not None), None)
    is_said = terms is not None or declared is not None
    number = terms if terms is not None else declared.terms if declared is not None else DEFAULT_TERMS
    shared = _shared_regions(analysis, name)
    wanted = declared.regions if regions is None and declared is not None else regions
    chosen = list(
        shared if wanted is None else [one for one in wanted if regions is not None or one in shared]
    )
    problems = [*_number_problems(below, number, within), *_region_problems(analysis, name, chosen, shared)]
    if problems:
        raise InputError(*problems)
    against = analysis.hypotheses[0].name
    models = (compile_model(analysis, name), compile_model(analysis, against))
    names = [one.name for one in analysis.hypotheses]
    children = np.random.SeedSequence(seed).spawn(len(names))
    functions = {
        region: region_functions(models[1], region, number if is_said else min(number, filled))
        for region, filled in filled_bins(models[1]).items()
        if region in chosen
    }
    return Question(models, (children[names.index(name)], children[0]), functions)


def signal_hypothesis(analysis: Analysis) -> str:
    """Return the first hypothesis, but for the first of all, that has a signal."""
    for one in analysis.hypotheses[1:]:
        if any(process.is_signal for process in analysis.processes_of(one.name)):
            return one.name
    raise InputError(
        Problem(
            "No hypothesis with a signal to break",
            "hypotheses",
            ", ".join(quoted(one.name) for one in analysis.hypotheses),
            "a hypothesis with a signal after the first",
            "add a hypothesis that lists a signal among its processes",
        )
    )


def _shared_regions(analysis: Analysis, hypothesis: str) -> tuple[str, ...]:
    """Return the regions where a hypothesis has both signal and background."""
    processes = analysis.processes_of(hypothesis)
    signal, background = (
        {name for one in processes if one.is_signal is kind for name in one.region_names}
        for kind in (True, False)
    )
    return tuple(region.name for region in analysis.regions if region.name in signal & background)


def _number_problems(below: float, terms: int, within: float) -> Iterator[Problem]:
    if not math.isfinite(below):
        yield Problem(
            "A threshold on ln B that is no number", "below", str(below), "a finite number", "below = 3"
        )
    if isinstance(terms, bool) or terms not in range(1, MOST_TERMS + 1):
        expected = f"a whole number from 1 to {MOST_TERMS}"
        yield Problem("A number of terms out of its range", "terms", str(terms), expected, "terms = 3")
    if not 0.0 < within <= LARGEST_WITHIN:
        expected = "a relative size above 0 and at most 1: 0.3 is thirty per cent"
        yield Problem(
            "A range that is no part of the background", "within", str(within), expected, "within = 0.3"
        )


def _region_problems(
    analysis: Analysis, hypothesis: str, chosen: Sequence[str], shared: Sequence[str]
) -> Iterator[Problem]:
    if not any(one.is_signal for one in analysis.processes_of(hypothesis)):
        yield Problem(
            "A hypothesis without a signal",
            "hypothesis",
            quoted(hypothesis),
            "a hypothesis whose evidence a wrong background could have made",
            "name a hypothesis with a signal",
        )
        return
    if hypothesis == analysis.hypotheses[0].name:
        yield Problem(
            "A hypothesis compared with itself",
            "hypothesis",
            quoted(hypothesis),
            "a hypothesis after the first, which every other is compared with",
            "name another hypothesis, or list background only first",
        )
    for region in chosen:
        if region not in {one.name for one in analysis.regions}:
            known = [one.name for one in analysis.regions]
            yield Problem(
                "A region that is not declared",
                "regions",
                quoted(region),
                "one of: " + ", ".join(known),
                nearest(region, known),
            )
        elif region not in shared:
            yield Problem(
                "A region without both signal and background",
                "regions",
                quoted(region),
                "a region where the hypothesis has a signal over a background"
                + (": " + ", ".join(shared) if shared else ""),
                "leave it out",
            )
    if not chosen:
        yield Problem(
            "No region to distort",
            "regions",
            "none where the hypothesis has both signal and background",
            "a background under the signal",
            "there is nothing to break here",
        )
