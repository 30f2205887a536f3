"""One page of pictures: the odds above, the counts of every region below."""

from __future__ import annotations

import io
from typing import TYPE_CHECKING

from workbench.plots.backgrounds import draw_backgrounds, inches_for
from workbench.plots.counts import draw_counts
from workbench.plots.distortion import draw_break_point_words, draw_distortion
from workbench.plots.odds import draw_odds
from workbench.plots.palette import LIGHT, Palette
from workbench.plots.triangle import draw_triangle
from workbench.records.outcomes import BackgroundsOutcome, BreakPointOutcome, WeighOutcome

if TYPE_CHECKING:
    from matplotlib.figure import Figure

    Page = Figure  # for those who save pages and leave matplotlib to this folder

KINDS = ("png", "svg", "pdf")
WIDTH = 9.0
_ODDS_HEIGHT = 3.2
_COUNTS_HEIGHT = 5.2
_TRIANGLE_HEIGHT = 3.6
_WORDS_HEIGHT = 1.0
_DISTORTION_HEIGHT = 3.6


def weighing_page(outcome: WeighOutcome, palette: Palette = LIGHT) -> Figure:
    """Return a figure with every comparison's odds, the triangle of three hypotheses, every region's counts.

    Args:
        outcome: what `weigh` found.
        palette: the theme's colours.
    """
    from matplotlib.figure import Figure

    comparisons, regions = outcome.weighing.comparisons, outcome.analysis.regions
    posteriors = outcome.weighing.posteriors
    has_triangle = len(posteriors) == 3 and all(one.probability is not None for one in posteriors)
    heights = [_ODDS_HEIGHT] * len(comparisons)
    heights += [_TRIANGLE_HEIGHT] * has_triangle + [_COUNTS_HEIGHT] * len(regions)
    page = Figure(figsize=(WIDTH, sum(heights)), facecolor=palette.paper)
    parts = page.subfigures(len(heights), 1, height_ratios=heights, squeeze=False)[:, 0]
    for place, comparison in enumerate(comparisons, start=1):
        axes = parts[place - 1].add_axes((0.03, 0.03, 0.94, 0.94))
        weighing = outcome.weighing
        draw_odds(axes, comparison, outcome.adequacies, weighing.evidences, palette, place)
    if has_triangle:
        draw_triangle(parts[len(comparisons)].add_axes((0.03, 0.03, 0.94, 0.94)), posteriors, palette)
    for place, region in enumerate(regions, start=len(comparisons) + has_triangle):
        draw_counts(parts[place], outcome.analysis, region.name, outcome.fits, palette)
    return page


def backgrounds_page(outcome: BackgroundsOutcome, palette: Palette = LIGHT) -> Figure:
    """Return a figure with the alternatives of the backgrounds.

    Args:
        outcome: what `backgrounds` found.
        palette: the theme's colours.
    """
    from matplotlib.figure import Figure

    page = Figure(figsize=(WIDTH, inches_for(outcome.found)), facecolor=palette.paper)
    draw_backgrounds(page, outcome.found, palette)
    return page


def break_point_page(outcome: BreakPointOutcome, palette: Palette = LIGHT) -> Figure:
    """Return a figure with the distortion that was found, one region below the other.

    Args:
        outcome: what `breakpoint` found.
        palette: the theme's colours.
    """
    from matplotlib.figure import Figure

    found = outcome.found
    regions = [(outcome.analysis.region(one.region), one) for one in found.distorted]
    heights = [_WORDS_HEIGHT, *[_DISTORTION_HEIGHT] * len(regions)]
    page = Figure(figsize=(WIDTH, sum(heights)), facecolor=palette.paper)
    parts = page.subfigures(len(heights), 1, height_ratios=heights, squeeze=False)[:, 0]
    draw_break_point_words(parts[0].add_axes((0.09, 0.0, 0.85, 1.0)), found, palette)
    for part, (region, distorted) in zip(parts[1:], regions, strict=True):
        draw_distortion(part.add_axes((0.09, 0.18, 0.72, 0.70)), region, distorted, palette)
    return page


def picture_bytes(figure: Figure, kind: str) -> bytes:
    """Return a figure as the content of a file.

    Args:
        figure: the figure.
        kind: one of `KINDS`.
    """
    content = io.BytesIO()
    figure.savefig(content, format=kind, dpi=150, facecolor=figure.get_facecolor())
    return content.getvalue()
