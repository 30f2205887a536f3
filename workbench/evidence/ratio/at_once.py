"""Odds and posterior densities of a scan under any prior, fast enough to follow a slider."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

from workbench.errors import InputError, Problem, nearest, quoted
from workbench.evidence.ratio.averages import aligned, averaged
from workbench.evidence.ratio.density import Density, posterior_density
from workbench.evidence.ratio.results import Average, Scan
from workbench.evidence.ratio.surface import Surface
from workbench.hypotheses.priors import Prior

_NOTHING: Mapping[str, Prior] = {}


@dataclass(frozen=True, slots=True, eq=False)
class Answer:
    """What the counts say under some priors.

    Attributes:
        average: the Bayes factor with its error, and the posterior odds.
        densities: posterior densities by parameter, if the hypothesis holds; none where the scan is not
            established.
    """

    average: Average
    densities: Mapping[str, Density]


class AtOnce:
    """Answers of one scan, asked for again and again; it fits nothing.

    What it keeps between questions is R averaged over the priors that stayed the same, and at nodes that suit
    such averages, so that a question costs the less the less has changed. The answers don't depend on what
    was asked before.

    Args:
        found: a scan over every parameter whose prior is going to change.
    """

    def __init__(self, found: Scan) -> None:
        self._found = found
        self._kept: dict[str, tuple[dict[str, Prior], Surface]] = {}
        self._aligned: Surface | None = None

    def under(
        self,
        priors: Mapping[str, Prior] = _NOTHING,
        *,
        prior_odds: float | None = None,
        densities: Sequence[str] | None = None,
    ) -> Answer:
        """Return Bayes factor, odds and densities under other priors.

        Args:
            priors: by parameter; those not named keep their stated prior.
            prior_odds: of the hypothesis against background only; None for the stated ones.
            densities: of which parameters; None for the strength with nodes of its own, if there is one.

        Returns:
            The answer.

        Raises:
            InputError: for a parameter that R is not known over, for a prior that reaches outside the range
                that it is known in, and where R is known nowhere.
        """
        average = self._found.reprior(priors)
        if prior_odds is not None:
            average = replace(average, prior_odds=prior_odds)
        surface = self._found.known
        asked = self._strength() if densities is None else densities
        _refuse_strangers(asked, surface)
        if not self._found.established:
            return Answer(average, {})
        return Answer(average, {name: self._density(name, dict(average.priors)) for name in asked})

    def _strength(self) -> tuple[str, ...]:
        strengths = self._found.known.strengths
        return () if strengths is None else (strengths.name,)

    def _density(self, name: str, priors: dict[str, Prior]) -> Density:
        """Return a density, averaging over the other parameters anew only where their priors changed."""
        others = {other: prior for other, prior in priors.items() if other != name}
        kept = self._kept.get(name)
        if kept is None or kept[0] != others:
            kept = (others, averaged(self._surface_for(name), others) if others else self._found.known)
            self._kept[name] = kept
        return posterior_density(kept[1], priors[name], self._found.units.get(name, ""))

    def _surface_for(self, name: str) -> Surface:
        """Return the surface, its strength nodes the same in all columns where these get averaged."""
        surface = self._found.known
        if surface.strengths is None or name != surface.strengths.name:
            return surface
        if self._aligned is None:
            self._aligned = aligned(surface, surface.strengths, [True] * len(surface.panels))
        return self._aligned


def _refuse_strangers(asked: Sequence[str], surface: Surface) -> None:
    problems = [
        Problem(
            "A density of a parameter that R is not known over",
            "densities",
            quoted(name),
            " or ".join(quoted(one) for one in surface.names),
            nearest(name, surface.names),
        )
        for name in asked
        if name not in surface.names
    ]
    if problems:
        raise InputError(*problems)
