"""What a fit answers: values with errors, how it ended, what moved."""

from __future__ import annotations

import enum
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]


class Ending(enum.Enum):
    """How a fit ended; the value is the sentence for the user."""

    CONVERGED = "converged"
    AT_LIMIT = "converged with a parameter at the end of its range"
    FLAT = "converged, but the data do not constrain some directions"
    NOT_CONVERGED = "did not converge; the best point found is shown and its errors are not to be used"
    NO_SUPPORT = "no parameter value can produce the observed counts"


@dataclass(frozen=True, slots=True)
class Fitted:
    """One parameter after a fit.

    Attributes:
        name, unit: the parameter or source; sources have no unit.
        role: "signal", "nuisance" or "source".
        value: fitted value.
        error: from the second derivatives; None where it means nothing (at a limit, flat).
        low, high: asymmetric errors (low negative), None where there is none on that side or not asked for.
        pull: (value - prior mean)/prior sd of sources and nuisance parameters, of ln value where the prior is
            lognormal; None for signal parameters and flat priors.
        contraction: 1 - (error/prior sd)**2; None where error is None or the parameter is a signal parameter.
        at_limit: True when the value is at an end of its range.
    """

    name: str
    unit: str
    role: str
    value: float
    error: float | None
    low: float | None
    high: float | None
    pull: float | None
    contraction: float | None
    at_limit: bool


@dataclass(frozen=True, slots=True, eq=False)
class Fit:
    """Maximum likelihood of one hypothesis.

    Attributes:
        hypothesis: its name.
        ending: how it ended.
        ln_likelihood: ln p of the counts at the best point [nats], penalties not included.
        penalised: the same with penalties, what was maximised [nats].
        fitted: every free parameter and source.
        correlations: (parameter, parameter) correlation matrix in the order of `fitted`; nan-free, 0 where an
            error is None.
        expected: (bin,) expected events of the whole hypothesis at the best point, all regions in order.
        by_process: process name to (bin,) expected events.
        notes: sentences on what stands out (flat directions and degenerate pairs by name).
        alternative: the alternative of the backgrounds that was fitted; empty where there is no doubt.
        others: the fits of the other alternatives, best first; none where there is no doubt.
    """

    hypothesis: str
    ending: Ending
    ln_likelihood: float
    penalised: float
    fitted: tuple[Fitted, ...]
    correlations: Array
    expected: Array
    by_process: dict[str, Array]
    notes: tuple[str, ...] = ()
    alternative: str = ""
    others: tuple[Fit, ...] = ()
