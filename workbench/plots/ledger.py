"""The ledger's pictures: the weight of each bin under the counts, and ln B with each uncertainty held."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np

from workbench.evidence.ledger.results import Account, Hold, Part
from workbench.hypotheses.analysis import Analysis
from workbench.likelihood.results import Fit
from workbench.plots.counts import draw_above
from workbench.plots.frame import clean_axes
from workbench.plots.palette import LIGHT, Palette, Stroke
from workbench.plots.words import shortened

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import FigureBase

BELOW = 1.7  # height of the strip, in thirds of that of the counts
MOST_HOLDS = 20


def draw_weights(
    figure: FigureBase,
    analysis: Analysis,
    account: Account,
    region_name: str,
    fits: Sequence[Fit],
    palette: Palette = LIGHT,
    place: int = 1,
) -> tuple[Axes, Axes]:
    """Draw one region's counts and, below, what each bin carries: its share, and what ln B loses without it.

    Args:
        figure: a figure or subfigure, drawn on as a whole.
        analysis: the analysis.
        account: the account of one Bayes factor, with its bins.
        region_name: which region.
        fits: one a hypothesis, in file order.
        palette: the theme's colours.
        place: the hypothesis' place in file order, for its colour.

    Returns:
        The axes of the counts and of the strip.
    """
    upper, lower = draw_above(figure, analysis, region_name, fits, palette, BELOW)
    parts = [part for part in account.bins if part.region == region_name]
    stroke = palette.hypothesis(place)
    lower.axhline(0.0, color=palette.faint, linewidth=0.8, zorder=3)
    lower.set_ylabel("weight [nats]", color=palette.ink)
    _draw_losses(lower, parts, stroke)
    _draw_shares(lower, parts, stroke, palette)
    _set_height(lower, account.bins)
    _name_bars(lower, account, parts, stroke, palette)
    return upper, lower


def _draw_losses(axes: Axes, parts: Sequence[Part], stroke: Stroke) -> None:
    known = [part for part in parts if part.loss is not None]
    axes.bar(
        [part.low for part in known],
        [part.loss or 0.0 for part in known],
        [part.high - part.low for part in known],
        align="edge",
        color=stroke.fill,
        linewidth=0,
        zorder=1,
        gid="loss",
    )


def _draw_shares(axes: Axes, parts: Sequence[Part], stroke: Stroke, palette: Palette) -> None:
    known = [part for part in parts if part.share is not None]
    centres = [0.5 * (part.low + part.high) for part in known]
    values = [part.share or 0.0 for part in known]
    widths = [0.5 * (part.high - part.low) for part in known]
    axes.bar(centres, values, widths, color=stroke.line, linewidth=0, zorder=2, gid="share")
    errors = np.array([part.share_error or 0.0 for part in known])
    if known:
        low, high = np.array(values) - errors, np.array(values) + errors
        axes.vlines(centres, low, high, color=palette.ink, linewidth=0.8, zorder=4, gid="share error")


def _set_height(axes: Axes, parts: Sequence[Part]) -> None:
    """Give every region of an account the same scale, so that a weight looks alike in all."""
    values = [value for part in parts for value in (part.share, part.loss) if value is not None]
    low, high = min([0.0, *values]), max([0.0, *values])
    room = 0.12 * (high - low) or 0.5
    axes.set_ylim(low - room, high + room)


def _name_bars(axes: Axes, account: Account, parts: Sequence[Part], stroke: Stroke, palette: Palette) -> None:
    """Write in the right margin what both kinds of bar are, and which way is for whom."""
    has_shares = any(part.share is not None for part in parts)
    share = "share of ln B;\nall add up to it" if has_shares else "shares are\nnot established"
    entries = [
        (0.93, 1.02, f"↑ for {shortened(account.comparison.hypothesis, 16)}", stroke.words),
        (0.66, 1.05, share, stroke.words if has_shares else palette.muted),
        (0.34, 1.05, "lost by ln B\nwithout the bin", palette.muted),
        (0.07, 1.02, f"↓ for {shortened(account.comparison.against, 16)}", palette.background.words),
    ]
    for height, left, words, colour in entries:
        axes.text(
            left, height, words, transform=axes.transAxes, color=colour, fontsize=9, va="center", gid="words"
        )
    for height, colour in ((0.66, stroke.line), (0.34, stroke.fill)):
        axes.plot(
            [1.03],
            [height],
            "s",
            markersize=7,
            color=colour,
            transform=axes.transAxes,
            clip_on=False,
            gid="key",
        )


def inches_for(account: Account) -> float:
    """Return the height that the picture of the uncertainties needs [inches]."""
    return 1.5 + 0.28 * max(min(len(account.uncertainties), MOST_HOLDS), 1)


def draw_holds(axes: Axes, account: Account, palette: Palette = LIGHT, place: int = 1) -> None:
    """Draw ln B with each uncertainty frozen and twice as large, the one that moves it most on top.

    Args:
        axes: empty axes, `inches_for(account)` high.
        account: the account of one Bayes factor, with its uncertainties.
        palette: the theme's colours.
        place: the hypothesis' place in file order, for its colour.
    """
    clean_axes(axes, palette)
    axes.figure.set_facecolor(palette.paper)
    value = account.comparison.ln_bayes_factor or 0.0
    holds = sorted(account.uncertainties, key=lambda hold: hold.reach(value), reverse=True)[:MOST_HOLDS]
    stroke = palette.hypothesis(place)
    for row, hold in enumerate(holds):
        _draw_pair(axes, row, hold, value, stroke, palette)
    axes.axvline(value, color=palette.ink, linewidth=1.2, zorder=1, gid="ln B")
    axes.set_ylim(max(len(holds), 1) - 0.4, -0.6)
    axes.set_yticks(range(len(holds)), [shortened(hold.name, 30) for hold in holds])
    for label in axes.get_yticklabels():
        label.set_color(palette.ink)
    axes.tick_params(axis="y", length=0)
    axes.spines["left"].set_visible(False)
    _set_width(axes, holds, value)
    axes.set_xlabel(
        "ln B;  open: the uncertainty frozen,  filled: twice as large,  line: as declared",
        color=palette.ink,
        fontsize=9,
    )
    names = f"{shortened(account.comparison.hypothesis)} against {shortened(account.comparison.against)}"
    axes.set_title(f"Uncertainties: {names}", loc="left", color=palette.ink, fontsize=11)


def _draw_pair(axes: Axes, row: int, hold: Hold, value: float, stroke: Stroke, palette: Palette) -> None:
    ends = [end for end in (hold.frozen, hold.doubled) if end is not None]
    if not ends:
        axes.text(value, row, "  not established", color=palette.muted, fontsize=8, va="center")
        return
    axes.plot(
        [min(value, *ends), max(value, *ends)],
        [row, row],
        color=stroke.fill,
        linewidth=4.0,
        solid_capstyle="butt",
        zorder=1.5,
        gid="reach",
    )
    sides = (
        (hold.frozen, hold.frozen_error, palette.paper, "frozen"),
        (hold.doubled, hold.doubled_error, stroke.line, "doubled"),
    )
    for end, error, face, name in sides:
        if end is not None:
            size = error or 0.0
            axes.plot([end - size, end + size], [row, row], color=palette.ink, linewidth=0.9, zorder=2.5)
            axes.plot(
                [end],
                [row],
                "o",
                markersize=6,
                markeredgecolor=stroke.line,
                markerfacecolor=face,
                zorder=3,
                gid=name,
            )


def _set_width(axes: Axes, holds: Sequence[Hold], value: float) -> None:
    """Give the axis room on both sides of what is drawn."""
    known = [end for hold in holds for end in (hold.frozen, hold.doubled) if end is not None]
    low, high = min([value, *known]), max([value, *known])
    room = max(0.08 * (high - low), 0.05)
    axes.set_xlim(low - room, high + room)
