"""The middle of a posterior: its median and its central 68.3 %, with their numerical errors."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy import special

CENTRAL = special.ndtr(np.array([0.0, -1.0, 1.0]))  # levels of the median and of the two ends


@dataclass(frozen=True, slots=True)
class Central:
    """A posterior's median and central interval.

    Attributes:
        median, low, high: of the posterior, and the ends of its central 68.3 %.
        median_error, low_error, high_error: their numerical errors, one standard error each.
    """

    median: float
    low: float
    high: float
    median_error: float
    low_error: float
    high_error: float
