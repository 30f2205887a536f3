"""Axes without what carries no information: two sides of the frame, in the theme's colours."""

from __future__ import annotations

from typing import TYPE_CHECKING

from workbench.plots.palette import Palette

if TYPE_CHECKING:
    from matplotlib.axes import Axes


def clean_axes(axes: Axes, palette: Palette) -> None:
    """Give axes the house's look; nothing outside these axes is changed."""
    axes.set_facecolor(palette.paper)
    for side in ("top", "right"):
        axes.spines[side].set_visible(False)
    for side in ("left", "bottom"):
        axes.spines[side].set_color(palette.faint)
    axes.tick_params(colors=palette.muted, which="both", labelsize=9)
