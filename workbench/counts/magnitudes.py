"""How large and how small the numbers are that can be worked with."""

from __future__ import annotations

from typing import Final

LARGEST: Final = 1e100  # in size; beyond it the squares and sums of later steps would overflow
SMALLEST: Final = 1e-100  # in size, but for 0; its square and its inverse are still ordinary numbers
LARGEST_FACTOR: Final = 1e6  # that one standard deviation may multiply by; products of a few stay finite
WORKABLE: Final = "0, or between 1e-100 and 1e100 in size"


def is_workable(number: float) -> bool:
    """Tell whether a number is 0 or of a size whose square and inverse can be worked with.

    Args:
        number: any number, nan and infinity included.

    Returns:
        False for nan, infinity, and whatever is smaller than 1e-100 or larger than 1e100 in size.

    Source:
        none, definition
    """
    return number == 0 or SMALLEST <= abs(number) <= LARGEST
