"""The page of an updating ratio: a curve over one parameter, a surface over two."""

from __future__ import annotations

from typing import TYPE_CHECKING

from workbench.evidence.ratio.reading import Profile, Sheet
from workbench.evidence.ratio.results import Scan
from workbench.plots.page import WIDTH
from workbench.plots.palette import LIGHT, Palette
from workbench.plots.scan import draw_curve, draw_sheet

if TYPE_CHECKING:
    from matplotlib.figure import Figure

_HEIGHT = 5.0


def scan_page(found: Scan, read: Profile | Sheet, palette: Palette = LIGHT) -> Figure:
    """Return a figure with an updating ratio over one or two parameters.

    Args:
        found: what `scan` found.
        read: R along its parameter, or over its two.
        palette: the theme's colours.
    """
    from matplotlib.figure import Figure

    page = Figure(figsize=(WIDTH, _HEIGHT), facecolor=palette.paper)
    if isinstance(read, Sheet):
        draw_sheet(page.add_axes((0.085, 0.115, 0.78, 0.725)), found, read, palette)
    else:
        draw_curve(page.add_axes((0.095, 0.115, 0.875, 0.755)), found, read, palette)
    return page
