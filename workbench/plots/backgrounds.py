"""The picture of backgrounds in doubt: how probable each is, ln B if it holds, and the signal it fakes."""

from __future__ import annotations

from typing import TYPE_CHECKING

from workbench.evidence.backgrounds import AVERAGE, Backgrounds
from workbench.plots.frame import clean_axes
from workbench.plots.palette import LIGHT, Palette, Stroke
from workbench.plots.words import shortened, wrapped

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure, SubFigure

_ROW = 0.72  # inches
_ABOVE, _BELOW = 0.85, 0.62  # inches above and below the rows
_LEGEND_LINE = 0.19  # inches
_MARKS = ("o", "s", "^", "D", "v", "P", "X", "<", ">", "*")


def inches_for(found: Backgrounds) -> float:
    """Return the height that the picture needs [inches]."""
    return _ABOVE + _BELOW + _ROW * (len(found.names) + 1 + _more_room(found))


def _more_room(found: Backgrounds) -> float:
    """Return how many rows more the last one needs to hold the legend."""
    lines = 1.6 + (len(found.names) + 1) // 2
    return max(_LEGEND_LINE * lines / _ROW - 0.9, 0.0)


def draw_backgrounds(figure: Figure | SubFigure, found: Backgrounds, palette: Palette = LIGHT) -> None:
    """Draw one row an alternative: its probabilities, ln B if it holds, and what others' counts fake in it.

    Args:
        figure: an empty figure, `inches_for(found)` high.
        found: what `backgrounds` found.
        palette: the theme's colours.
    """
    height = inches_for(found)
    axes = figure.subplots(1, 3, sharey=True, gridspec_kw={"width_ratios": (1.0, 1.0, 1.25)})
    top, bottom = 1.0 - _ABOVE / height, _BELOW / height
    figure.subplots_adjust(left=0.155, right=0.98, top=top, bottom=bottom, wspace=0.12)
    title = f"{shortened(found.hypothesis, 40)} against {shortened(found.against, 40)}"
    figure.text(0.012, 1.0 - 0.3 / height, title, color=palette.ink, fontsize=11, va="center", gid="title")
    rows = len(found.names) + 1
    for one in axes:
        clean_axes(one, palette)
        one.set_ylim(rows - 0.5 + _more_room(found), -0.5)
        one.tick_params(axis="y", length=0)
        one.spines["left"].set_visible(False)
        for row in range(rows - 1):
            one.axhline(row + 0.5, color=palette.faint, linewidth=0.4, alpha=0.5, zorder=0)
    axes[0].set_yticks(range(rows), [*(wrapped(name, 15) for name in found.names), AVERAGE])
    for label in axes[0].get_yticklabels():
        label.set_color(palette.ink)
        label.set_fontsize(9)
    _draw_probabilities(axes[0], found, palette)
    _draw_factors(axes[1], found, palette)
    _draw_fakes(axes[2], found, palette)


def _title(axes: Axes, words: str, palette: Palette) -> None:
    axes.set_title(words, loc="left", color=palette.muted, fontsize=10)


def _draw_probabilities(axes: Axes, found: Backgrounds, palette: Palette) -> None:
    _title(axes, "how probable", palette)
    axes.set_xlim(0.0, 1.0)
    axes.set_xticks([0.0, 0.5, 1.0], ["0", "0.5", "1"])
    strokes = (palette.background, palette.signal)
    for row, prior in enumerate(found.priors):
        axes.plot([prior, prior], [row - 0.36, row + 0.36], color=palette.ink, linewidth=1.4, gid="prior")
    evidences = () if found.weighing is None else found.weighing.evidences
    for shift, evidence, stroke in zip((-0.16, 0.16), evidences, strokes, strict=False):
        posteriors = {one.name: one.posterior for one in evidence.alternatives}
        for row, name in enumerate(found.names):
            value = posteriors.get(name)
            if value is not None:
                _bar(axes, row + shift, value, stroke)
    axes.set_xlabel("prior |   posterior ▬", color=palette.muted, fontsize=9)
    if evidences:
        names = (found.against, found.hypothesis)
        for height, name, stroke in zip((-0.16, 0.16), names, strokes, strict=True):
            axes.text(
                0.02,
                len(found.names) + height,
                f"▬ under {shortened(name, 20)}",
                color=stroke.words,
                fontsize=8.5,
                va="center",
                gid="key",
            )


def _bar(axes: Axes, height: float, value: float, stroke: Stroke) -> None:
    axes.barh(
        height, value, height=0.26, color=stroke.fill, edgecolor=stroke.line, linewidth=1.2, gid="posterior"
    )


def _draw_factors(axes: Axes, found: Backgrounds, palette: Palette) -> None:
    _title(axes, "ln B if it holds", palette)
    if found.weighing is None:
        axes.set_xlim(-1.0, 1.0)
        axes.set_xticks([])
        middle = (len(found.names) - 1) // 2
        axes.text(0.0, middle, "nothing observed yet", color=palette.muted, ha="center", va="center")
        return
    axes.axvline(0.0, color=palette.faint, linewidth=0.8, zorder=0)
    (comparison,) = found.weighing.comparisons
    known = {one.name: one.ln_bayes_factor for one in comparison.alternatives if one.established}
    values = [known.get(name) for name in found.names]
    values.append(comparison.ln_bayes_factor if comparison.established else None)
    shown = [value for value in values if value is not None] or [0.0]
    low, high = min(0.0, *shown), max(0.0, *shown)
    room = 0.28 * max(high - low, 1.0)
    axes.set_xlim(low - room, high + room)
    for row, value in enumerate(values):
        if value is None:
            axes.text(
                0.0, row, "not established", color=palette.muted, fontsize=8.5, ha="center", va="center"
            )
            continue
        is_average = row == len(found.names)
        face = palette.ink if is_average else palette.paper
        axes.plot([value], [row], "o", markersize=8, color=palette.ink, markerfacecolor=face, gid="ln B")
        text = f"{value:.2f}".replace("-", "−")
        axes.text(
            value,
            row - 0.22,
            text,
            color=palette.ink,
            fontsize=9,
            ha="center",
            va="bottom",
            bbox={
                "facecolor": palette.paper,
                "edgecolor": "none",
                "pad": 1.0,
            },  # guides pass behind the words
            gid="value",
        )
    if values[-1] is not None:
        ends = [-0.5, len(found.names)]
        axes.plot([values[-1]] * 2, ends, ":", color=palette.muted, linewidth=1.0, zorder=0, gid="average")
    sides = f"← {shortened(found.against, 15)}    {shortened(found.hypothesis, 15)} →"
    axes.set_xlabel(sides, color=palette.muted, fontsize=9)


def _draw_fakes(axes: Axes, found: Backgrounds, palette: Palette) -> None:
    _title(axes, "signal faked, in its errors", palette)
    ends = [-0.5, len(found.names) - 0.5]
    axes.plot([0.0, 0.0], ends, color=palette.faint, linewidth=0.8, zorder=0, gid="no signal")
    sizes = [0.5]
    for fake in found.fakes:
        if fake.fitted not in found.names or fake.fitted == fake.truth:
            continue
        row, which = found.names.index(fake.fitted), found.names.index(fake.truth)
        for strength in fake.strengths:
            if strength.in_errors is not None:
                sizes.append(abs(strength.in_errors))
                axes.plot(
                    [strength.in_errors],
                    [row],
                    _MARKS[which % len(_MARKS)],
                    color=palette.signal.line,
                    markerfacecolor=palette.signal.fill,
                    markersize=8,
                    gid="fake",
                )
    edge = 1.25 * max(sizes)
    axes.set_xlim(-edge, edge)
    axes.set_xlabel("fitted strength / error", color=palette.muted, fontsize=9)
    handles = [
        axes.plot([], [], mark, color=palette.signal.line, markerfacecolor=palette.signal.fill, markersize=7)[
            0
        ]
        for mark, _ in zip(_MARKS * len(found.names), found.names, strict=False)
    ]
    rows = len(found.names) + 1 + _more_room(found)
    legend = axes.legend(
        handles,
        [shortened(name, 16) for name in found.names],
        title="in the expected counts of",
        loc="upper left",
        bbox_to_anchor=(0.0, 1.0 - (len(found.names) + 0.06) / rows),
        ncols=2,
        frameon=False,
        fontsize=8,
        title_fontsize=8,
        labelcolor=palette.ink,
        borderpad=0.0,
        borderaxespad=0.0,
        handletextpad=0.2,
        columnspacing=0.8,
        alignment="left",
    )
    legend.get_title().set_color(palette.muted)
