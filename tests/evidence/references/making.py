"""The reference evidence of one hypothesis: brute quadrature in few dimensions, long sampling in more."""

from __future__ import annotations

import numpy as np

from tests.evidence.references.direct import Direct
from tests.evidence.references.importance import Reference, sampled
from tests.evidence.references.quadrature import integrated

WANTED = 7e-4  # standard error to stop at [nats]
MOST = 2**21  # draws


def reference(
    direct: Direct,
    seed: int | tuple[int, ...],
    wanted: float = WANTED,
    most: int = MOST,
    *,
    drawn: bool = False,
) -> Reference:
    """Return a hypothesis' reference evidence.

    Args:
        direct: the hypothesis.
        seed: where random numbers come from.
        wanted: the standard error to stop at [nats].
        most: at most how many draws.
        drawn: True draws also where quadrature would do.
    """
    with np.errstate(all="ignore"):  # an impossible point has ln likelihood -inf
        if direct.size == 0:
            value = float(direct.ln_likelihood(np.zeros((1, 0)))[0])
            return Reference(value, 1e-7, "one point", 1)
        if direct.size <= 2 and not drawn:
            return integrated(direct.ln_likelihood, direct.size)
        return sampled(direct.ln_likelihood, direct.size, seed, wanted, most)
