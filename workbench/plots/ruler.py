"""A ruler in powers of ten: where its marks stand and what they say."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import TYPE_CHECKING

from workbench.plots.palette import Palette
from workbench.plots.words import extent, overlaps

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.text import Text

MOST_MARKS = 9
_WRITTEN_OUT = 5  # 100,000 : 1 is still read at a glance


def ruler_range(values: Sequence[float]) -> tuple[float, float]:
    """Return the ends of a ruler that holds even odds and every given value with room beside it.

    Args:
        values: log10 odds.

    Returns:
        The ends, in log10 odds.
    """
    low, high = min(-1.0, *values), max(1.0, *values)
    room = max(0.4, 0.08 * (high - low))
    return low - room, high + room


def ruler_step(low: float, high: float, most: int = MOST_MARKS) -> int:
    """Return the number of decades between marks: 1, 2, 5, 10, 20, 50..."""
    decade, step = 1, 1
    while (high - low) / step > most:
        for factor in (1, 2, 5):
            step = factor * decade
            if (high - low) / step <= most:
                return step
        decade *= 10
    return step


def mark_text(decade: int) -> str:
    """Return the odds at a mark as words: "1,000 : 1", "1 : 10", powers of ten where those get long."""
    size = abs(decade)
    number = f"{10**size:,}" if size <= _WRITTEN_OUT else f"$10^{{{size}}}$"
    return f"{number} : 1" if decade >= 0 else f"1 : {number}"


def draw_ruler(axes: Axes, height: float, palette: Palette, *, is_faint: bool = False) -> list[Text]:
    """Draw a ruler along the whole x range of axes, with as many words as there is room for.

    Args:
        axes: x in log10 odds, y from 0 to 1.
        height: its y.
        palette: the theme's colours.
        is_faint: True for a ruler that nothing is read from.

    Returns:
        The words, from left to right.
    """
    low, high = axes.get_xlim()
    colour = palette.faint if is_faint else palette.ink
    axes.plot(
        [low, high], [height, height], "--" if is_faint else "-", color=colour, linewidth=1.6, gid="ruler"
    )
    step = ruler_step(low, high)
    while True:
        decades = [place * step for place in range(math.ceil(low / step), math.floor(high / step) + 1)]
        words = [_mark(axes, decade, height, palette) for decade in decades]
        if len(words) < 3 or not overlaps(words):
            break
        for word in words:
            word.remove()
        step = 2 * step
    words = _inside(axes, words)
    for decade in decades:
        axes.plot([decade, decade], [height - 0.022, height + 0.022], color=colour, linewidth=1.4, gid="mark")
    return words


def _inside(axes: Axes, words: list[Text]) -> list[Text]:
    """Return the words that are not cut off at the ends; the others are taken away, their marks stay."""
    frame = axes.get_window_extent()
    kept = []
    for word in words:
        left, right = extent(word)
        if left < frame.x0 or right > frame.x1:
            word.remove()
        else:
            kept.append(word)
    return kept


def _mark(axes: Axes, decade: int, height: float, palette: Palette) -> Text:
    is_even = decade == 0
    return axes.text(
        decade,
        height - 0.065,
        mark_text(decade),
        ha="center",
        va="top",
        fontsize=9,
        color=palette.ink if is_even else palette.muted,
        weight="bold" if is_even else "normal",
        gid="mark words",
    )
