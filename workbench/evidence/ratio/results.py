"""What a scan answers: the updating ratio with its errors, and what another prior makes of it."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np
import numpy.typing as npt

from workbench.errors import InputError, Problem, quoted
from workbench.evidence.ratio.averages import averaged
from workbench.evidence.ratio.reaching import refuse_outside
from workbench.evidence.ratio.surface import Surface
from workbench.hypotheses.priors import Prior

Array = npt.NDArray[np.float64]

_STEPS, _ROUNDS, _CLOSER = 21, 5, 0.3  # in the search for the peak between nodes
_RULE = 1e-3  # nats by which averages over cells may be off, of any surface


@dataclass(frozen=True, slots=True)
class Check:
    """R at one point, evaluated directly with the signal parameters held there, and as the surface has it.

    Attributes:
        values: parameter to value.
        ln_ratio, error: the surface's ln R and its error [nats].
        direct, direct_error: the engine's [nats].
    """

    values: Mapping[str, float]
    ln_ratio: float
    error: float
    direct: float
    direct_error: float

    @property
    def pull(self) -> float:
        """Return the difference in units of both errors."""
        return (self.ln_ratio - self.direct) / max(math.hypot(self.error, self.direct_error), 1e-12)


@dataclass(frozen=True, slots=True)
class Average:
    """A Bayes factor as the average of R over priors.

    Attributes:
        hypothesis, against: what is compared.
        priors: of the parameters that R is known over, by name.
        averaged: priors that R had been averaged over before.
        ln_bayes_factor, error: ln B and its numerical error [nats].
        prior_odds: ratio of the hypotheses' prior probabilities.
        established: True when the surface is.
    """

    hypothesis: str
    against: str
    priors: Mapping[str, Prior]
    averaged: Mapping[str, Prior]
    ln_bayes_factor: float
    error: float
    prior_odds: float
    established: bool

    @property
    def ln_posterior_odds(self) -> float | None:
        """Return ln of the posterior odds; None where nothing is established."""
        return self.ln_bayes_factor + math.log(self.prior_odds) if self.established else None


@dataclass(frozen=True, eq=False)
class Scan:
    """The updating ratio of a hypothesis over some or all of its signal parameters.

    Attributes:
        hypothesis, against: what is compared; `against` is the background-only hypothesis.
        over: the parameters, as asked for.
        surface: ln R over them, with its errors; None where one of the two hypotheses has no evidence at all.
        priors: their stated priors; no part of R.
        averaged: priors of the other signal parameters, which R was averaged over.
        units: parameter to unit.
        prior_odds: ratio of the hypotheses' prior probabilities.
        is_nested: True where the hypothesis without signal is the one it is compared with, so that R is 1 at
            strength 0.
        ln_bayes_factor, ln_bayes_factor_error: the engine's ln B under the stated priors [nats]; None where
            it has none.
        checks: direct evaluations between the nodes.
        established: True when both evidences are, and the surface agrees with them and with the checks.
        reason: why it is not; empty when it is.
        seed: the seed that every random number came from.
        draws: at each node.
    """

    hypothesis: str
    against: str
    over: tuple[str, ...]
    surface: Surface | None
    priors: Mapping[str, Prior]
    averaged: Mapping[str, Prior]
    units: Mapping[str, str]
    prior_odds: float
    is_nested: bool
    ln_bayes_factor: float | None
    ln_bayes_factor_error: float | None
    established: bool
    reason: str
    seed: int
    draws: int
    checks: tuple[Check, ...] = field(default=())

    def reprior(self, priors: Mapping[str, Prior] | None = None) -> Average:
        """Return the Bayes factor under other priors of the parameters scanned, without fitting again.

            B = integral of R(x) prior(x) dx

        Args:
            priors: by parameter; those not named keep their stated prior.

        Returns:
            ln B with its numerical error.

        Raises:
            InputError: for a parameter that R is not known over, for a prior that reaches outside the range
                that it is known in, and where R is known nowhere.

        Source:
            None, definition: the Bayes factor is the average of the updating ratio over the signal prior.
        """
        asked = {} if priors is None else dict(priors)
        surface = self.known
        refuse_outside(asked, surface.ranges, self.averaged)
        used = {name: asked.get(name, self.priors[name]) for name in self.over}
        whole = averaged(surface, used)
        error = math.hypot(float(whole.error[0, 0]), _RULE)
        return Average(
            self.hypothesis,
            self.against,
            used,
            self.averaged,
            float(whole.ln_ratio[0, 0]),
            error,
            self.prior_odds,
            self.established,
        )

    @property
    def known(self) -> Surface:
        """Return the surface, or refuse where there is none."""
        if self.surface is None:
            raise InputError(
                Problem(
                    "R is known nowhere",
                    f"scan of {quoted(self.hypothesis)}",
                    self.reason,
                    "two evidences",
                    "mend the reason, and scan again",
                )
            )
        return self.surface

    @property
    def peak(self) -> tuple[dict[str, float], float, float]:
        """Return where R is largest, ln R there and its error [nats]."""
        surface = self.known
        place = np.unravel_index(int(np.argmax(surface.ln_ratio)), surface.ln_ratio.shape)
        best, reach = surface.nodes[place], self._spacing(place)
        low, high = np.array(list(surface.ranges.values())).T
        steps = np.linspace(-1.0, 1.0, _STEPS)
        for _ in range(_ROUNDS):
            for axis in range(best.size):
                points = np.repeat(best[None], _STEPS, axis=0)
                points[:, axis] = np.clip(best[axis] + reach[axis] * steps, low[axis], high[axis])
                best = points[int(np.argmax(surface.at(points)[0]))]
            reach = reach * _CLOSER
        ln_ratio, error = surface.at(best[None])
        values = dict(zip(surface.names, best.tolist(), strict=True))
        return {name: values[name] for name in self.over}, float(ln_ratio[0]), float(error[0])

    def _spacing(self, place: tuple[np.intp, ...]) -> Array:
        """Return (parameter,) distance to the neighbouring nodes of one."""
        surface = self.known
        found = []
        for one, value in zip(surface.panels, surface.outer[place[0]], strict=True):
            away = np.abs(one.nodes - value)
            found.append(float(away[away > 0.0].min()) * 2.0)
        if surface.strengths is not None:
            nodes = surface.strengths.nodes[place[0]]
            found.append(float(np.abs(np.diff(nodes))[max(int(place[1]) - 1, 0) : int(place[1]) + 1].max()))
        return np.array(found)
