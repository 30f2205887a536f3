"""Bars of a ratio in a column of text: to the right of a line at 1 where it is above 1, else to the left."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]

_WIDTH = 30
_LEAST = -9.0  # decades shown below 1, where there are more
_STEPS = (0.05, 0.1, 0.2, 0.25, 0.5, 1.0, 2.0, 5.0, 10.0, 20.0, 50.0, 100.0)


@dataclass(frozen=True, slots=True)
class Bars:
    """A column of bars.

    Attributes:
        header: what stands above them: how much one block is.
        rows: one bar a value; "◂" where it goes on beyond the column.
    """

    header: str
    rows: tuple[str, ...]


def bars(ln_ratio: Array) -> Bars:
    """Return a bar for each ratio, on a scale of powers of ten.

    Args:
        ln_ratio: (row,) ln of each ratio [nats].
    """
    decades = ln_ratio / math.log(10.0)
    low = max(min(float(decades.min()), 0.0), _LEAST)
    high = max(float(decades.max()), 0.0)
    low = max(low, -2.0 * max(high, 1.5))
    step = next((one for one in _STEPS if (high - low) / one <= _WIDTH), _STEPS[-1])
    left = math.ceil(-low / step)
    rows = tuple(_bar(float(value), step, left) for value in decades)
    return Bars(f"{' ' * left}│ a block: {_words(step)}", rows)


def _bar(value: float, step: float, left: int) -> str:
    blocks = round(abs(value) / step)
    if value >= 0.0:
        return f"{' ' * left}│{'█' * blocks}"
    if blocks > left:
        return f"{'◂' + '█' * (left - 1) if left else ''}│"
    return f"{' ' * (left - blocks)}{'█' * blocks}│"


def _words(step: float) -> str:
    return f"× {10.0**step:.3g}" if step < 6.0 else f"× 10^{step:.0f}"
