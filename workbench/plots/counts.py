"""The counts picture: observed counts over each hypothesis' fit, and the excess below."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import pairwise
from typing import TYPE_CHECKING

import numpy as np
import numpy.typing as npt

from workbench.counts.binning import Binning
from workbench.counts.region import Region
from workbench.hypotheses.analysis import Analysis
from workbench.likelihood.results import Fit
from workbench.plots.frame import clean_axes
from workbench.plots.palette import LIGHT, Palette
from workbench.plots.small_counts import excess, interval
from workbench.plots.words import spread, typeset, wrapped
from workbench.records.descriptions import exposure_words
from workbench.records.numbers import as_written

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import FigureBase

Array = npt.NDArray[np.float64]

LOGARITHMIC_FROM = (
    60.0  # ratio of the largest to the smallest expected events from which a straight axis hides bins
)
HIGHEST_EXCESS = 8.0


def draw_counts(
    figure: FigureBase, analysis: Analysis, region_name: str, fits: Sequence[Fit], palette: Palette = LIGHT
) -> tuple[Axes, Axes]:
    """Draw one region's counts with every hypothesis' fit, and the excess over the first below.

    Args:
        figure: a figure or subfigure, drawn on as a whole.
        analysis: the analysis.
        region_name: which region.
        fits: one a hypothesis, in file order.
        palette: the theme's colours.

    Returns:
        The axes of the counts and of the excess.
    """
    upper, lower = draw_above(figure, analysis, region_name, fits, palette)
    bins = _bins_of(analysis, region_name)
    _draw_excess(lower, analysis.region(region_name), [fit.expected[bins] for fit in fits], palette)
    return upper, lower


def draw_above(
    figure: FigureBase,
    analysis: Analysis,
    region_name: str,
    fits: Sequence[Fit],
    palette: Palette = LIGHT,
    below: float = 1.0,
) -> tuple[Axes, Axes]:
    """Draw one region's counts with every hypothesis' fit, above empty axes along the same observable.

    Args:
        figure: a figure or subfigure, drawn on as a whole.
        analysis: the analysis.
        region_name: which region.
        fits: one a hypothesis, in file order.
        palette: the theme's colours.
        below: height of the empty axes, in thirds of that of the counts.

    Returns:
        The axes of the counts and the empty ones.
    """
    region = analysis.region(region_name)
    bins = _bins_of(analysis, region_name)
    curves = [fit.expected[bins] for fit in fits]
    per_width, label = _scale(region)
    upper, lower = _panels(figure, region, palette, below)
    _draw_curves(upper, region.table.binning, [curve / per_width for curve in curves], palette)
    _set_heights(upper, region, curves, per_width)
    _draw_points(upper, region, per_width, palette)
    upper.set_ylabel(label, color=palette.ink)
    upper.tick_params(labelbottom=False)
    upper.set_title(_title(analysis, region), loc="left", color=palette.ink, fontsize=11)
    lower.set_xlabel(axis_words(region), color=palette.ink)
    _name_marks(
        upper, region, [fit.hypothesis for fit in fits], [curve / per_width for curve in curves], palette
    )
    return upper, lower


def _panels(figure: FigureBase, region: Region, palette: Palette, below: float) -> tuple[Axes, Axes]:
    grid = figure.add_gridspec(
        2, 1, height_ratios=(3, below), hspace=0.08, left=0.09, right=0.81, top=0.90, bottom=0.13
    )
    upper = figure.add_subplot(grid[0])
    lower = figure.add_subplot(grid[1], sharex=upper)
    figure.set_facecolor(palette.paper)
    for axes in (upper, lower):
        clean_axes(axes, palette)
    binning = region.table.binning
    upper.set_xlim(binning.first - 0.02 * (binning.last - binning.first), binning.last)
    return upper, lower


def _bins_of(analysis: Analysis, region_name: str) -> slice:
    start = 0
    for region in analysis.regions:
        stop = start + region.table.binning.number
        if region.name == region_name:
            break
        start = stop
    return slice(start, stop)


def _scale(region: Region) -> tuple[Array, str]:
    """Return what counts are divided by, and the axis' words: unequal bins are drawn per unit of width."""
    widths = region.table.binning.high - region.table.binning.low
    unit = f" {region.unit}" if region.unit else ""
    if np.ptp(widths) <= 1e-9 * widths.max():
        width = as_written(float(f"{widths[0]:.6g}"))
        return np.ones_like(widths), typeset(f"events / {width}{unit}") if widths.size > 1 else "events"
    return widths, f"events /{unit or ' unit of width'}"


def runs(binning: Binning) -> list[slice]:
    """Return the stretches of bins without a gap between them."""
    gaps = binning.low[1:] - binning.high[:-1]
    breaks = np.flatnonzero(gaps > 1e-9 * (binning.high - binning.low)[:-1]) + 1
    ends = [0, *(int(place) for place in breaks), binning.number]
    return [slice(start, stop) for start, stop in pairwise(ends)]


def _draw_curves(axes: Axes, binning: Binning, curves: Sequence[Array], palette: Palette) -> None:
    for place, curve in enumerate(curves):
        stroke = palette.hypothesis(place)
        for part in runs(binning):
            edges = np.append(binning.low[part], binning.high[part][-1])
            axes.stairs(
                curve[part],
                edges,
                baseline=None,  # no walls at the sides
                color=stroke.line,
                linewidth=stroke.width,
                linestyle=stroke.dashes,
                gid=f"hypothesis {place}",
                zorder=2 + 0.1 * place,
            )


def _draw_points(axes: Axes, region: Region, per_width: Array, palette: Palette) -> None:
    observed = region.table.observed
    if observed is None:
        return
    binning = region.table.binning
    centres = 0.5 * (binning.low + binning.high)
    low, high = interval(observed)
    axes.vlines(
        centres,
        low / per_width,
        high / per_width,
        color=palette.ink,
        linewidth=0.9,
        zorder=4,
        gid="intervals",
    )
    is_straight = axes.get_yscale() == "linear"
    shown = np.full(observed.shape, True) if is_straight else observed > 0.0
    axes.plot(
        centres[shown],
        (observed / per_width)[shown],
        "o",
        markersize=_marker_size(binning.number),
        color=palette.ink,
        clip_on=not is_straight,  # a point at zero is shown whole; a logarithmic axis has no zero
        zorder=4,
        gid="observed",
    )


def _set_heights(axes: Axes, region: Region, curves: Sequence[Array], per_width: Array) -> None:
    observed = region.table.observed
    tops = [*curves] if observed is None else [*curves, interval(observed)[1]]
    top = max((float((values / per_width).max()) for values in tops), default=1.0) or 1.0
    positive = [float((curve / per_width)[curve > 0.0].min()) for curve in curves if np.any(curve > 0.0)]
    highest = max((float((curve / per_width).max()) for curve in curves), default=top)
    lowest = min(positive, default=top)
    if highest > LOGARITHMIC_FROM * lowest:
        axes.set_yscale("log")
        axes.set_ylim(0.4 * max(lowest, 1e-6 * highest), 2.0 * top)
    else:
        axes.set_ylim(0.0, 1.08 * top)


def _draw_excess(axes: Axes, region: Region, curves: Sequence[Array], palette: Palette) -> None:
    axes.axhline(0.0, color=palette.background.line, linewidth=1.4, zorder=1)
    axes.set_ylabel("excess [sd]", color=palette.ink)
    binning = region.table.binning
    if not curves:
        return
    known = [excess(curve, curves[0]) for curve in curves[1:]]
    _draw_excess_curves(axes, binning, known, palette)
    shown = [values[np.isfinite(values)] for values in known]
    if region.table.observed is not None:
        values = excess(region.table.observed, curves[0])
        shown.append(values[np.isfinite(values)])
        _draw_excess_points(axes, binning, values, palette)
    size = max((float(np.abs(values).max()) for values in shown if values.size), default=0.0)
    edge = min(max(1.15 * size, 3.3), HIGHEST_EXCESS)
    axes.set_ylim(-edge, edge)


def _draw_excess_curves(axes: Axes, binning: Binning, known: Sequence[Array], palette: Palette) -> None:
    for place, values in enumerate(known, start=1):
        stroke = palette.hypothesis(place)
        for part in runs(binning):
            edges = np.append(binning.low[part], binning.high[part][-1])
            finite = np.where(np.isfinite(values[part]), values[part], np.nan)
            axes.stairs(
                finite,
                edges,
                baseline=None,
                color=stroke.line,
                linewidth=stroke.width,
                linestyle=stroke.dashes,
                gid=f"excess of hypothesis {place}",
                zorder=2,
            )


def _draw_excess_points(axes: Axes, binning: Binning, values: Array, palette: Palette) -> None:
    centres = 0.5 * (binning.low + binning.high)
    size = _marker_size(binning.number)
    inside = np.abs(values) <= HIGHEST_EXCESS
    axes.plot(
        centres[inside], values[inside], "o", color=palette.ink, markersize=size, gid="excess", zorder=3
    )
    axes.vlines(centres[inside], 0.0, values[inside], color=palette.ink, linewidth=0.7, zorder=3)
    for marker, edge, beyond in (("^", 0.93, values > HIGHEST_EXCESS), ("v", 0.07, values < -HIGHEST_EXCESS)):
        if np.any(beyond):
            axes.plot(
                centres[beyond],
                np.full(int(beyond.sum()), edge),
                marker,
                color=palette.ink,
                markersize=size + 2.0,
                transform=axes.get_xaxis_transform(),
                gid="excess outside",
            )


def _marker_size(bins: int) -> float:
    return 4.0 if bins <= 80 else 2.5 if bins <= 300 else 1.5


def _name_marks(
    axes: Axes, region: Region, names: Sequence[str], curves: Sequence[Array], palette: Palette
) -> None:
    """Write each mark's name in the right margin, level with its last bin, moved apart where needed."""
    entries = [
        (wrapped(name), palette.hypothesis(place).words, float(curve[-1]))
        for place, (name, curve) in enumerate(zip(names, curves, strict=True))
    ]
    observed = region.table.observed
    if observed is not None:
        per_width, _ = _scale(region)
        entries.append(("observed\n68 % intervals", palette.ink, float(observed[-1] / per_width[-1])))
    to_axes = axes.transData + axes.transAxes.inverted()
    bottom = axes.get_ylim()[0]
    at_end = [float(to_axes.transform((0.0, max(value, bottom)))[1]) for _, _, value in entries]
    line = 0.075
    sizes = [line * (1 + words.count("\n")) + 0.02 for words, _, _ in entries]
    for (words, colour, _), end, centre in zip(entries, at_end, spread(at_end, sizes, 0.0, 1.0), strict=True):
        axes.annotate(
            words,
            xy=(1.005, end),
            xytext=(1.06, centre),
            xycoords="axes fraction",
            textcoords="axes fraction",
            color=colour,
            fontsize=9,
            va="center",
            annotation_clip=False,
            arrowprops={
                "arrowstyle": "-",
                "color": colour,
                "linewidth": 0.7,
                "shrinkA": 2,
                "shrinkB": 0,
                "relpos": (0.0, 0.5),
            },
        )


def _title(analysis: Analysis, region: Region) -> str:
    parts = [region.name.replace("$", r"\$")]
    if analysis.exposure is not None:
        parts.append(exposure_words(analysis.exposure))
    return typeset("  ·  ".join(parts))


def axis_words(region: Region) -> str:
    """Return what a region's axis measures, with its unit, typeset."""
    name = (region.observable or region.name).replace("$", r"\$")
    return typeset(f"{name} [{region.unit}]") if region.unit else name
