"""The fit picture: where each nuisance parameter and source went, against the prior it came from."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from workbench.likelihood.results import Fit, Fitted
from workbench.plots.frame import clean_axes
from workbench.plots.palette import LIGHT, Palette
from workbench.plots.words import shortened

if TYPE_CHECKING:
    from matplotlib.axes import Axes

_OUTERMOST = 4.5  # prior standard deviations; farther pulls stand at the edge with their number


def inches_for(fit: Fit) -> float:
    """Return the height that a fit's picture needs [inches]."""
    return 1.1 + 0.27 * max(len(pulled(fit)), 1)


def pulled(fit: Fit) -> tuple[Fitted, ...]:
    """Return the parameters that have a pull: sources and nuisance parameters with a width to their prior."""
    return tuple(item for item in fit.fitted if item.pull is not None)


def draw_fitted(axes: Axes, fit: Fit, palette: Palette = LIGHT, place: int = 0) -> None:
    """Draw each pull with its error over the prior's own interval, one row a parameter, in prior sd.

    Args:
        axes: empty axes, `inches_for(fit)` high.
        fit: the fit of one hypothesis.
        palette: the theme's colours.
        place: the hypothesis' place in file order, for its colour.
    """
    clean_axes(axes, palette)
    axes.figure.set_facecolor(palette.paper)
    rows = pulled(fit)
    stroke = palette.hypothesis(place)
    axes.set_title(shortened(fit.hypothesis, 60), loc="left", color=stroke.words, fontsize=11)
    if not rows:
        axes.set_axis_off()
        axes.text(0.5, 0.5, "no parameter of this hypothesis has a pull", color=palette.muted, ha="center")
        return
    for row, item in enumerate(rows):
        axes.barh(row, 2.0, left=-1.0, height=0.62, color=stroke.fill, linewidth=0, zorder=1, gid="prior")
        _draw_row(axes, row, item, palette)
    axes.axvline(0.0, color=palette.faint, linewidth=0.8, zorder=0)
    reach = max((abs(item.pull or 0.0) + _relative_error(item) for item in rows), default=1.0)
    edge = min(max(2.0, 1.1 * reach), _OUTERMOST + 0.5)
    axes.set_xlim(-edge, edge)
    axes.set_xticks(range(-int(edge), int(edge) + 1))
    axes.set_ylim(len(rows) - 0.4, -0.6)
    axes.set_yticks(range(len(rows)), [shortened(item.name, 36) for item in rows])
    for label in axes.get_yticklabels():
        label.set_color(palette.ink)
    axes.tick_params(axis="y", length=0)
    axes.spines["left"].set_visible(False)
    axes.set_xlabel(
        "(fitted − prior centre) / prior sd;  band: the prior's one sd", color=palette.ink, fontsize=9
    )


def _draw_row(axes: Axes, row: int, item: Fitted, palette: Palette) -> None:
    pull = item.pull or 0.0
    shown = max(-_OUTERMOST, min(pull, _OUTERMOST))
    error = _relative_error(item)
    is_sure = item.contraction is not None
    if is_sure and shown == pull:
        axes.plot(
            [pull - error, pull + error],
            [row, row],
            color=palette.ink,
            linewidth=1.6,
            zorder=3,
            gid="posterior",
        )
    face = palette.ink if is_sure else palette.paper
    axes.plot(
        [shown],
        [row],
        "o",
        markersize=5,
        markeredgecolor=palette.ink,
        markerfacecolor=face,
        zorder=4,
        gid="pull",
    )
    if shown != pull:
        side = "right" if pull > 0 else "left"
        axes.text(
            shown,
            row - 0.1,
            f" {pull:+.1f} ".replace("-", "−"),
            ha=side,
            va="bottom",
            color=palette.ink,
            fontsize=8,
        )


def _relative_error(item: Fitted) -> float:
    """Return the error in prior sd, which is what the contraction says: error/sd = sqrt(1 - contraction)."""
    return 0.0 if item.contraction is None else math.sqrt(max(1.0 - item.contraction, 0.0))
