"""ln B under a distortion: made by the engine at some of them, carried from there by its posterior draws.

With the backgrounds multiplied by exp(c f), and draws x of the posterior under the distortion a:

    Z(c)/Z(a) = E[ L(x; c)/L(x; a) ],    d ln Z/dc_k = E_c[ sum_i dlnP_i/dT_i B_i f_ki + ... ]

both for the signal hypothesis and for the one that it is compared with. The farther c is from a, the fewer
draws carry the ratio; their effective number says how far it can be trusted.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.errors import quoted
from workbench.evidence.weigh import Weighed
from workbench.likelihood.laws import bin_ln_probability
from workbench.likelihood.model import Model
from workbench.likelihood.objective import values_at_once
from workbench.likelihood.slopes import negative_binomial_slopes, poisson_slopes

Array = npt.NDArray[np.float64]
Indices = npt.NDArray[np.intp]

_MOST_NUMBERS = 2_000_000  # draws times bins that are kept, so that a trial takes milliseconds
_LEAST_DRAWS = 500
_NEGLIGIBLE = 30.0  # nats below the largest weight
_LEAST_EFFECTIVE = 60.0
_LARGEST_NOISE = 0.15  # of a slope
NO_DRAWS = "its posterior was not drawn from"


@dataclass(frozen=True, slots=True, eq=False)
class Trial:
    """ln B under one distortion.

    Attributes:
        coefficients: (term,) c.
        ln_bayes_factor: ln B [nats].
        slope: (term,) its derivatives [nats].
        is_reliable: True when enough draws carry it, and its slope stands out of their noise.
    """

    coefficients: Array
    ln_bayes_factor: float
    slope: Array
    is_reliable: bool


@dataclass(frozen=True, slots=True, eq=False)
class Carried:
    """What draws say of one hypothesis under another distortion.

    Attributes:
        change: of ln Z [nats].
        slope: (term,) derivatives of ln Z [nats].
        noise: one standard error of the slope, all terms together [nats].
        is_carried: True when enough draws carry it.
    """

    change: float
    slope: Array
    noise: float
    is_carried: bool


@dataclass(frozen=True, slots=True, eq=False)
class Draws:
    """Posterior draws of one hypothesis, as far as a distortion needs them; bins are the distorted ones.

    Attributes:
        ln_weights: (draw,) ln of their weights [nats].
        background, signal: (draw, bin) expected events, the backgrounds undistorted [events].
        noise_background, noise_signal: (draw, bin) variances of the templates [events^2]; None if Poisson.
        counts: (bin,) observed counts [events].
        at: (draw,) ln probability of the counts at the anchor's distortion [nats].
    """

    ln_weights: Array
    background: Array
    signal: Array
    noise_background: Array | None
    noise_signal: Array | None
    counts: Array
    at: Array

    def moved(self, factors: Array, functions: Array) -> Carried:
        """Return the change of ln Z from the anchor's distortion; one draw without coordinates is exact.

        Args:
            factors: (bin,) what multiplies the backgrounds.
            functions: (term, bin) the smooth functions.
        """
        expected, variance = self.expected(factors)
        ln_ratio = bin_ln_probability(expected, variance, self.counts).sum(axis=-1) - self.at
        ln_weights = self.ln_weights + ln_ratio
        change = float(special.logsumexp(ln_weights) - special.logsumexp(self.ln_weights))
        weights = special.softmax(ln_weights)
        background = factors * self.background
        if variance is None or self.noise_background is None:
            pulled = poisson_slopes(self.counts, expected).t * background
        else:
            slopes = negative_binomial_slopes(self.counts, expected, variance)
            pulled = slopes.t * background + 2.0 * slopes.v * factors**2 * self.noise_background
        slope = functions @ (weights @ pulled)
        off = pulled @ functions.T - slope
        noise = float(np.sqrt(np.sum((weights[:, None] * off) ** 2)))
        is_carried = weights.size == 1 or float(np.sum(weights**2)) * _LEAST_EFFECTIVE <= 1.0
        return Carried(change, slope, noise, is_carried)

    def expected(self, factors: Array) -> tuple[Array, Array | None]:
        """Return (draw, bin) expected events under a distortion, and their variance with template errors."""
        total = factors * self.background + self.signal
        if self.noise_background is None or self.noise_signal is None:
            return total, None
        return total, factors**2 * self.noise_background + self.noise_signal


@dataclass(frozen=True, slots=True, eq=False)
class Anchor:
    """The pair of evidences that the engine made under one distortion.

    Attributes:
        coefficients: (term,) the distortion.
        functions: (term, bin) the smooth functions, at the distorted bins.
        pair: the signal hypothesis and the one that it is compared with.
        draws: their draws; empty where an evidence is not established.
        tilt: returns (term,) derivatives of ln B from differences of quadratures, for where counts are so
            many that draws tell them poorly.
    """

    coefficients: Array
    functions: Array
    pair: tuple[Weighed, Weighed]
    draws: tuple[Draws, ...]
    tilt: Callable[[], Array]

    @property
    def reason(self) -> str:
        """Return why there is no ln B here, or no way on from it; empty where there is."""
        if self.draws:
            return ""
        doubts = [
            f"{quoted(one.model.hypothesis)}: {one.evidence.reason or NO_DRAWS}"
            for one in self.pair
            if not one.evidence.established or one.sample is None
        ]
        return doubts[0]

    @property
    def ln_bayes_factor(self) -> float:
        """Return ln B as the engine made it [nats]."""
        signal, against = (one.evidence.ln_evidence or 0.0 for one in self.pair)
        return signal - against

    @property
    def error(self) -> float:
        """Return one standard error of ln B [nats]."""
        return float(np.linalg.norm([one.evidence.error or 0.0 for one in self.pair]))

    def trial(self, coefficients: Array) -> Trial:
        """Return ln B under another distortion, carried there by the draws."""
        factors = np.exp(coefficients @ self.functions)
        up, down = (one.moved(factors, self.functions) for one in self.draws)
        moved, slope = self.ln_bayes_factor + up.change - down.change, up.slope - down.slope
        is_carried = (up.is_carried and down.is_carried) or np.array_equal(coefficients, self.coefficients)
        is_clear = np.hypot(up.noise, down.noise) <= _LARGEST_NOISE * np.linalg.norm(slope)
        return Trial(coefficients, moved, slope, bool(is_carried and is_clear and np.isfinite(moved)))


def draws_of(weighed: Weighed, undistorted: Model, bins: Indices, factors: Array) -> Draws:
    """Return the posterior draws of a weighed hypothesis.

    Args:
        weighed: the hypothesis under the anchor's distortion, with its sampling pass.
        undistorted: the same hypothesis as declared.
        bins: (bin,) which bins are distorted, by their places among all.
        factors: (bin,) what multiplies the backgrounds at the anchor.

    Returns:
        The draws; far-off ones are left out, and thinned evenly where they would not fit into memory.
    """
    sample = weighed.sample
    points = np.zeros((1, 0)) if sample is None else sample.points
    ln_weights = np.zeros(len(points)) if sample is None else sample.ln_weights
    kept = np.flatnonzero(ln_weights > ln_weights.max() - _NEGLIGIBLE)
    most = max(_LEAST_DRAWS, _MOST_NUMBERS // bins.size)
    stride = -(-kept.size // most)
    kept = kept[::stride]
    background, noise_background = _expected(undistorted, "background", points[kept], bins)
    signal, noise_signal = _expected(undistorted, "signal", points[kept], bins)
    if noise_background is None or noise_signal is None:
        noise_background = noise_signal = None
    counts = undistorted.observed_for("a break point")[bins]
    nowhere = np.zeros(len(kept))
    made = Draws(ln_weights[kept], background, signal, noise_background, noise_signal, counts, nowhere)
    at = bin_ln_probability(*made.expected(factors), counts).sum(axis=-1)
    return Draws(ln_weights[kept], background, signal, noise_background, noise_signal, counts, at)


def _expected(model: Model, kind: str, points: Array, bins: Indices) -> tuple[Array, Array | None]:
    """Return (draw, bin) events and variance of one kind of process; spare events go with the signal."""
    only = model.restricted(kind, spare=kind == "signal")
    rows = values_at_once(model)
    pieces = [
        only.expected(only.seeds(points[first : first + rows])) for first in range(0, len(points), rows)
    ]
    events = np.concatenate([total[:, bins] for total, _ in pieces])
    if not model.has_template_errors:
        return events, None
    nothing = np.zeros_like(events)
    known = [variance[:, bins] for _, variance in pieces if variance is not None]
    return events, np.concatenate(known) if known else nothing
