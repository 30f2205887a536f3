"""The break point's picture: how the background would have to be wrong, over where the signal is."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from workbench.counts.region import Region
from workbench.evidence.breaking.results import BreakPoint, Distorted
from workbench.plots.counts import axis_words, runs
from workbench.plots.frame import clean_axes
from workbench.plots.palette import LIGHT, Palette
from workbench.plots.words import fill_block, shortened
from workbench.records.numbers import ln_with_error
from workbench.records.sentences import break_point_words

if TYPE_CHECKING:
    from matplotlib.axes import Axes

_ROOM = 1.25
_SIGNAL_SHARE = 0.6  # of the upper half, for the signal's shape


def draw_break_point_words(axes: Axes, found: BreakPoint, palette: Palette = LIGHT) -> None:
    """Write the answer in words above the drawing.

    Args:
        axes: empty axes, some 8 by 1 inches; their frame is taken away.
        found: the break point.
        palette: the theme's colours.
    """
    axes.set_axis_off()
    axes.figure.set_facecolor(palette.paper)
    axes.set(xlim=(0.0, 1.0), ylim=(0.0, 1.0))
    if not found.ending.is_answer:
        sentences = ["not established: no break point is given", found.reason]
    else:
        sentences = [break_point_words(found)]
    if found.reached is not None and found.ln_bayes_factor is not None:
        before = ln_with_error(found.ln_bayes_factor, found.ln_bayes_factor_error or 0.0)
        after = ln_with_error(found.reached, found.reached_error or 0.0)
        sentences.append(f"ln B as declared {before}, at this distortion {after}")
    text = axes.text(0.0, 0.45, "", color=palette.ink, fontsize=11, va="center", gid="words")
    fill_block(text, sentences, axes, 0.85)


def draw_distortion(axes: Axes, region: Region, distorted: Distorted, palette: Palette = LIGHT) -> None:
    """Draw the relative change of one region's background, and the signal's shape below it.

    Args:
        axes: empty axes.
        region: the region.
        distorted: its distortion.
        palette: the theme's colours.
    """
    clean_axes(axes, palette)
    axes.figure.set_facecolor(palette.paper)
    binning, change = region.table.binning, 100.0 * distorted.change
    top = _ROOM * max(float(change.max()), 0.3 * float(np.abs(change).max()), 1e-9)
    bottom = _ROOM * min(float(change.min()), -0.08 * top)
    highest = float(distorted.signal.max()) or 1.0
    shape = distorted.signal / highest * _SIGNAL_SHARE * top
    ground, signal = palette.background, palette.signal
    for place, part in enumerate(runs(binning)):
        edges = np.append(binning.low[part], binning.high[part][-1])
        is_first = place == 0
        axes.stairs(
            shape[part],
            edges,
            fill=True,
            color=signal.fill,
            linewidth=0,
            zorder=1,
            gid="signal",
            label="signal's shape\n(any unit)" if is_first else None,
        )
        axes.stairs(
            change[part],
            edges,
            baseline=None,
            color=ground.line,
            linewidth=ground.width,
            zorder=3,
            gid="change",
            label="change of the\nbackground" if is_first else None,
        )
    axes.axhline(0.0, color=palette.faint, linewidth=0.9, zorder=2)
    axes.set_xlim(binning.first, binning.last)
    axes.set_ylim(bottom, top)
    axes.set_ylabel("background, change [%]", color=palette.ink)
    axes.set_xlabel(axis_words(region), color=palette.ink)
    axes.set_title(shortened(region.name, 60), loc="left", color=palette.ink, fontsize=11)
    legend = axes.legend(loc="center left", bbox_to_anchor=(1.01, 0.5), frameon=False, fontsize=9)
    for text, colour in zip(legend.get_texts(), (signal.words, ground.words), strict=True):
        text.set_color(colour)
