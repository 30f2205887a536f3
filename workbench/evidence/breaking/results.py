"""What the search for a break point answers."""

from __future__ import annotations

from dataclasses import dataclass
from enum import Enum

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]


class Breaking(Enum):
    """How the search ended, with the user's sentence."""

    FOUND = "a distortion of this size brings ln B down to the threshold"
    BELOW_ALREADY = "ln B is below the threshold without any distortion"
    NOT_WITHIN = "no smooth distortion within the range brings ln B below the threshold"
    NOT_SETTLED = "the search came to no end: the counts are too many for how far a distortion may go"
    NOT_ESTABLISHED = "an evidence on the way is not established"

    @property
    def is_answer(self) -> bool:
        """Tell whether the question is answered, with a break point or with the word that there is none."""
        return self not in {Breaking.NOT_SETTLED, Breaking.NOT_ESTABLISHED}


@dataclass(frozen=True, slots=True, eq=False)
class Distorted:
    """The distortion that was found, in one region.

    Attributes:
        region: the region's name.
        coefficients: (term,) ln factors of the level, the tilt, the bow and so on.
        change: (bin,) relative change of the background, 0.03 for 3 % more.
        background: (bin,) expected background at the nominal values, undistorted [events].
        signal: (bin,) expected signal, averaged over the posterior of the undistorted analysis [events].
    """

    region: str
    coefficients: tuple[float, ...]
    change: Array
    background: Array
    signal: Array


@dataclass(frozen=True, slots=True, eq=False)
class BreakPoint:
    """The smallest smooth distortion of the backgrounds that brings ln B down to a threshold.

    Sizes are relative: 0.03 is three per cent. Under the peak means weighted with the expected signal.

    Attributes:
        hypothesis, against: the hypotheses compared; the second is the first of the file.
        below: the threshold on ln B [nats].
        within: the largest rms that was looked at.
        terms: smooth functions in each region.
        ending: how the search ended.
        reason: which evidence is not established, and why; empty otherwise.
        ln_bayes_factor, ln_bayes_factor_error: without a distortion [nats].
        under_peak, under_peak_error: change of the background under the peak; None where nothing was found.
        rms, rms_error: root of the mean square of the change over the background's events, the squares of
            several regions added up; None where nothing was found.
        reached, reached_error: ln B there, made afresh; the smallest within the range where nothing was found
            [nats].
        stated_before, stated_after: what the declared uncertainties of the backgrounds amount to under the
            peak, one relative standard deviation, before and after the counts.
        distorted: the distortion, region by region; that of the smallest ln B where nothing was found.
        evidences: how often the pair of evidences was made.
    """

    hypothesis: str
    against: str
    below: float
    within: float
    terms: int
    ending: Breaking
    reason: str
    ln_bayes_factor: float | None
    ln_bayes_factor_error: float | None
    under_peak: float | None = None
    under_peak_error: float | None = None
    rms: float | None = None
    rms_error: float | None = None
    reached: float | None = None
    reached_error: float | None = None
    stated_before: float | None = None
    stated_after: float | None = None
    distorted: tuple[Distorted, ...] = ()
    evidences: int = 1
