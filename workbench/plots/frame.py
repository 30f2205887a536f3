"""Axes without what carries no information: two sides of the frame, in the theme's colours."""

from __future__ import annotations

from typing import TYPE_CHECKING

from workbench.plots.palette import Palette
from workbench.records.numbers import trimmed

if TYPE_CHECKING:
    from matplotlib.axes import Axes


def axis_of_doublings(axes: Axes, low: float, high: float) -> None:
    """Give axes an x axis in steps of a factor 2, its numbers written out."""
    from matplotlib.ticker import FuncFormatter, NullLocator

    axes.set_xscale("log", base=2)
    axes.set_xlim(low, high)
    axes.xaxis.set_major_formatter(FuncFormatter(lambda value, _: trimmed(float(value))))
    axes.xaxis.set_minor_locator(NullLocator())


def clean_axes(axes: Axes, palette: Palette) -> None:
    """Give axes the house's look; nothing outside these axes is changed."""
    axes.set_facecolor(palette.paper)
    for side in ("top", "right"):
        axes.spines[side].set_visible(False)
    for side in ("left", "bottom"):
        axes.spines[side].set_color(palette.faint)
    axes.tick_params(colors=palette.muted, which="both", labelsize=9)
