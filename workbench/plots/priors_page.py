"""One page on priors: ln B by mean, the map of verdicts under it, nuisance priors below."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
import numpy.typing as npt

from workbench.evidence.prior_choice.powers import most_moving
from workbench.evidence.prior_choice.results import PriorSensitivity
from workbench.evidence.prior_choice.sensitivity import SCALES
from workbench.plots.palette import LIGHT, Palette
from workbench.plots.powers import draw_power_changes, draw_sensitivities
from workbench.plots.prior_curves import draw_prior_curves
from workbench.plots.prior_map import draw_prior_key, draw_prior_map
from workbench.plots.words import keep_inside, shortened
from workbench.records.numbers import ln_with_error, trimmed
from workbench.records.outcomes import PriorsOutcome
from workbench.records.sentences import verdict_on_all

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure, FigureBase

Array = npt.NDArray[np.float64]

WIDTH = 9.0
_HEAD, _CURVES, _MAP, _ROW, _AROUND = 0.75, 3.5, 4.0, 0.24, 1.25
_MOST = 24  # nuisance priors that are drawn
_LEFT, _RIGHT = 0.20, 0.86


def priors_page(outcome: PriorsOutcome, palette: Palette = LIGHT) -> Figure:
    """Return a figure that says how far the Bayes factor rests on the priors.

    Args:
        outcome: what `priors` found.
        palette: the theme's colours.
    """
    from matplotlib.figure import Figure

    found = outcome.found
    if not found.established:
        page = Figure(figsize=(WIDTH, 2.0), facecolor=palette.paper)
        _draw_reason(page, outcome, palette)
        return page
    shown = most_moving(found.scalings, _MOST)
    below = _AROUND + _ROW * len(shown) if shown else 0.0
    heights = [_HEAD, _CURVES, _MAP, *([below] if shown else [])]
    page = Figure(figsize=(WIDTH, sum(heights)), facecolor=palette.paper)
    parts = page.subfigures(len(heights), 1, height_ratios=heights, squeeze=False)[:, 0]
    for part in parts:
        part.set_facecolor(palette.paper)
    _draw_head(parts[0], outcome, palette)
    _draw_strength(parts[1], parts[2], found, palette)
    if shown:
        _draw_powers(parts[3], found, palette)
    return page


def _draw_head(part: FigureBase, outcome: PriorsOutcome, palette: Palette) -> None:
    found = outcome.found
    axes = part.add_axes((0.03, 0.0, 0.94, 1.0))
    axes.set_axis_off()
    axes.set_xlim(0.0, 1.0)
    axes.set_ylim(0.0, 1.0)
    comparison = found.comparison
    names = f"{shortened(comparison.hypothesis)} against {shortened(comparison.against)}"
    title = f"{shortened(outcome.analysis.title, 60)}: what the priors put in"
    words = axes.text(0.0, 0.80, title, fontsize=12, color=palette.ink, va="center")
    keep_inside(words, axes)
    value = ln_with_error(comparison.ln_bayes_factor or 0.0, comparison.ln_bayes_factor_error or 0.0)
    verdict = verdict_on_all(outcome.adequacies)
    said = f"{names}: ln B = {value} with the prior of {shortened(found.strength)} {found.declared.text} (●)"
    words = axes.text(0.0, 0.40, said, fontsize=9.5, color=palette.ink, va="center")
    keep_inside(words, axes)
    if verdict:
        loud = axes.text(0.0, 0.08, verdict.upper(), fontsize=9.5, color=palette.ink, va="center")
        loud.set_fontweight("bold")
        loud.set_gid("adequacy")


def _draw_strength(above: FigureBase, below: FigureBase, found: PriorSensitivity, palette: Palette) -> None:
    curves = above.add_axes((_LEFT, 0.04, _RIGHT - _LEFT, 0.78))
    draw_prior_curves(curves, found, SCALES[0], palette)
    _add_events(curves, found, palette)
    curves.tick_params(labelbottom=False)
    chart = below.add_axes((_LEFT, 0.34, _RIGHT - _LEFT, 0.64))
    draw_prior_map(chart, found, SCALES[0], palette)
    chart.set_xlabel(f"mean of the prior of {shortened(found.strength)}", color=palette.ink, fontsize=9)
    key = below.add_axes((_LEFT, 0.01, _RIGHT - _LEFT, 0.17))
    draw_prior_key(key, found, SCALES[0], palette)


def _add_events(axes: Axes, found: PriorSensitivity, palette: Palette) -> None:
    """Write the mean in signal events above the axes."""
    from matplotlib.ticker import FuncFormatter, LogLocator, NullLocator

    per_strength = found.events or 1.0

    def to_events(mean: npt.ArrayLike) -> Array:
        return np.asarray(mean, dtype=float) * per_strength

    def to_mean(number: npt.ArrayLike) -> Array:
        return np.asarray(number, dtype=float) / per_strength

    above = axes.secondary_xaxis("top", functions=(to_events, to_mean))
    above.xaxis.set_major_locator(LogLocator(10.0, (1.0, 2.0, 5.0)))
    above.xaxis.set_major_formatter(FuncFormatter(lambda value, _: trimmed(float(value))))
    above.xaxis.set_minor_locator(NullLocator())
    above.set_xlabel("mean of the prior, in signal events", color=palette.ink, fontsize=9)
    above.tick_params(colors=palette.muted, labelsize=9)
    above.spines["top"].set_color(palette.faint)


def _draw_powers(part: FigureBase, found: PriorSensitivity, palette: Palette) -> None:
    shown = most_moving(found.scalings, _MOST)
    height = _ROW * len(shown) / (_AROUND + _ROW * len(shown))
    bottom = 0.62 / (_AROUND + _ROW * len(shown))
    left = part.add_axes((_LEFT, bottom, 0.31, height))
    right = part.add_axes((_LEFT + 0.35, bottom, 0.31, height))
    draw_sensitivities(left, shown, palette)
    draw_power_changes(right, shown, palette)
    more = len(found.scalings) - len(shown)
    title = "Nuisance priors, each raised to a power" + (
        f" (the {len(shown)} that move ln B most; {more} move it less)" if more else ""
    )
    part.text(0.03, bottom + height + 0.04, title, fontsize=10, color=palette.ink, va="bottom")


def _draw_reason(page: Figure, outcome: PriorsOutcome, palette: Palette) -> None:
    axes = page.add_axes((0.04, 0.05, 0.92, 0.9))
    axes.set_axis_off()
    axes.set_xlim(0.0, 1.0)
    title = "not established: nothing is said about priors"
    axes.text(0.0, 0.8, title, weight="bold", fontsize=12, color=palette.ink)
    words = axes.text(0.0, 0.45, outcome.found.reason, fontsize=9.5, color=palette.ink)
    keep_inside(words, axes)
