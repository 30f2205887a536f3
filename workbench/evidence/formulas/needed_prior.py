"""How probable a hypothesis must have been for its posterior to reach what is wanted."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
from scipy import special

Array = npt.NDArray[np.float64]


def least_prior(ln_bayes_factor: npt.ArrayLike, posterior: float) -> Array:
    """Return the smallest prior probability from which a Bayes factor leads to a wanted posterior.

    With P the posterior wanted, between two hypotheses:
        p = 1/(1 + B (1 - P)/P)

    Args:
        ln_bayes_factor: (...) ln B in favour of the hypothesis [nats].
        posterior: P; 0 < P < 1.

    Returns:
        (...) p.

    Source:
        Bayes' theorem, solved for the prior. Reported beside odds after J.K. Kruschke, Bayesian analysis
        reporting guidelines, Nat. Hum. Behav. 5 (2021) 1282; from memory.
    """
    wanted = special.logit(posterior)
    return np.asarray(special.expit(wanted - np.asarray(ln_bayes_factor, dtype=float)))
