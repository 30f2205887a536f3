"""Keeping memory between evaluations, whose arrays come and go by the megabyte."""

from __future__ import annotations

from functools import cache

import numpy as np

_LARGEST_KEPT = 31 * 2**20  # bytes; glibc's threshold stops growing at 32 MiB


@cache
def keep_freed_memory() -> None:
    """Let the C library keep freed arrays for the next ones instead of handing them back to the system.

    glibc asks the system for each array above a threshold, and every page of it then costs a fault before it
    can be written: two thirds of the time of an evaluation at some hundred points. The threshold follows the
    largest such array that was freed, so one array that is made, never written and dropped raises it for
    good. Elsewhere this does nothing.

    Source:
        mallopt(3), M_MMAP_THRESHOLD: the dynamic threshold; measured in tests/benchmarks.
    """
    np.empty(_LARGEST_KEPT, dtype=np.uint8)
