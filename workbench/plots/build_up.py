"""The picture of how evidence builds up: ln B of all counts so far, against exposure."""

from __future__ import annotations

import math
from itertools import pairwise
from typing import TYPE_CHECKING

import numpy as np
import numpy.typing as npt

from workbench.ensembles.build_up import BuildUp, Step
from workbench.evidence.results import Comparison
from workbench.plots.drawing import Rows, Sketch
from workbench.plots.frame import clean_axes
from workbench.plots.palette import LIGHT, Palette
from workbench.plots.ruler import mark_text, ruler_step
from workbench.plots.words import SMALLEST, extent, keep_inside, shortened, typeset
from workbench.records.numbers import count, ln_with_error, odds, trimmed
from workbench.records.sentences import ln_posterior_odds

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure
    from matplotlib.text import Text

Array = npt.NDArray[np.float64]

_LN_10 = math.log(10.0)
_LEAST = 1.5  # nats on either side of 0 that are shown at least
_MOST_MARKS = 7
_LINE = 0.075  # of the axes' height, for a line of words above them
_NO_COUNTS = "no counts so far"
_NOBODY = "no hypothesis describes these counts (p < 0.01)"


def draw_build_up(axes: Axes, found: BuildUp, palette: Palette = LIGHT) -> None:
    """Draw ln B against exposure, one curve a comparison, with its numerical error as a band.

    A step that is not established is an open mark, and no curve runs through it. Steps at which no hypothesis
    describes the counts are marked below and said.

    Args:
        axes: empty axes, at least some 5 by 3 inches, room for three lines of words above them.
        found: the steps.
        palette: the theme's colours.
    """
    clean_axes(axes, palette)
    axes.axhline(0.0, color=palette.ink, linewidth=1.0, zorder=1, gid="even")
    unit = f" [{found.unit}]" if found.unit else ""
    axes.set_xlabel(typeset(f"exposure{unit}"), color=palette.ink, fontsize=10)
    axes.set_ylabel("ln B of all counts so far", color=palette.ink, fontsize=10)
    _set_limits(axes, found)
    _mark_decades(axes, palette)
    if not found.steps:
        axes.text(
            0.5, 0.6, _NO_COUNTS, transform=axes.transAxes, color=palette.muted, ha="center", gid="none"
        )
        return
    last = found.steps[-1].comparisons
    for place, one in enumerate(last, start=1):
        _draw_curve(axes, found, one.hypothesis, place, palette)
    for line, (place, one) in enumerate(reversed([*enumerate(last, start=1)])):
        _write_end(axes, found, one, (line, place), palette)
    against = shortened(last[0].against) if last else ""
    axes.set_title(
        f"Build-up of the evidence against {against}", loc="left", color=palette.ink, fontsize=10,
        pad=8.0 + 17.0 * len(last),
    )  # fmt: skip
    _draw_failures(axes, found, palette)


def _set_limits(axes: Axes, found: BuildUp) -> None:
    values = [
        one.ln_bayes_factor + side * (one.ln_bayes_factor_error or 0.0)
        for step in found.steps
        for one in step.comparisons
        if one.ln_bayes_factor is not None
        for side in (-1.0, 1.0)
    ]
    low, high = min(-_LEAST, *values, 0.0), max(_LEAST, *values, 0.0)
    room = 0.08 * (high - low)
    axes.set_ylim(low - room, high + room)
    end = found.steps[-1].exposure if found.steps else 1.0
    axes.set_xlim(0.0, 1.02 * end)


def _draw_curve(axes: Axes, found: BuildUp, hypothesis: str, place: int, palette: Palette) -> None:
    stroke = palette.hypothesis(place)
    exposure = np.array([step.exposure for step in found.steps])
    ones = [_of(step, hypothesis) for step in found.steps]
    value = np.array([np.nan if one.ln_bayes_factor is None else one.ln_bayes_factor for one in ones])
    error = np.array([one.ln_bayes_factor_error or 0.0 for one in ones])
    stands = np.array([one.established for one in ones])
    sure = np.where(stands, value, np.nan)
    axes.fill_between(
        exposure, sure - error, sure + error, color=stroke.line, alpha=0.35, linewidth=0.0, gid="error"
    )
    axes.plot(
        exposure,
        sure,
        color=stroke.line,
        linewidth=stroke.width,
        linestyle=stroke.dashes,
        gid="curve",
        zorder=3,
    )
    size = 4.5 if exposure.size <= 40 else 0.0
    axes.plot(exposure, sure, "o", color=stroke.line, markersize=size, gid="step", zorder=4)
    axes.plot(exposure[-1:], sure[-1:], "o", color=stroke.line, markersize=7, gid="last", zorder=5)
    if (~stands).any():
        _mark_unsure(axes, exposure[~stands], value[~stands], place, palette)


def _mark_unsure(axes: Axes, exposure: Array, value: Array, place: int, palette: Palette) -> None:
    """Draw what is not established as open marks, and say so; what has no number at all leaves a gap."""
    stroke = palette.hypothesis(place)
    axes.plot(
        exposure, value, "o", markerfacecolor=palette.paper, markeredgecolor=stroke.line,
        markersize=6, gid="not established", zorder=4,
    )  # fmt: skip
    there = np.isfinite(value)
    if there.any():
        text = axes.annotate(
            "not established", (exposure[there][-1], value[there][-1]), (0.0, -9.0),
            textcoords="offset points", ha="center", va="top", fontsize=8, color=stroke.words,
            bbox={"facecolor": palette.paper, "edgecolor": "none", "pad": 1.0}, gid="not established words",
        )  # fmt: skip
        text.set_clip_on(True)


def _of(step: Step, hypothesis: str) -> Comparison:
    return next(one for one in step.comparisons if one.hypothesis == hypothesis)


def _write_end(axes: Axes, found: BuildUp, one: Comparison, where: tuple[int, int], palette: Palette) -> None:
    """Write above the axes what the last step says of a hypothesis, its line as a key."""
    line, place = where
    stroke = palette.hypothesis(place)
    height = 1.0 + _LINE * (line + 0.5)
    axes.plot(
        [0.0, 0.03], [height, height], color=stroke.line, linewidth=stroke.width, linestyle=stroke.dashes,
        transform=axes.transAxes, clip_on=False, gid="key",
    )  # fmt: skip
    words = f"{shortened(one.hypothesis, 28)} at {_exposure(found, found.steps[-1])}: {_numbers(one)}"
    text = axes.text(
        0.04, height, typeset(words), transform=axes.transAxes, color=stroke.words, fontsize=9, va="center",
        gid="end words",
    )  # fmt: skip
    _fit(text, axes)


def _fit(text: Text, axes: Axes) -> None:
    """Shrink words that run beyond the axes' right end."""
    size = float(text.get_fontsize())
    while extent(text)[1] > axes.get_window_extent().x1 and size > SMALLEST:
        size = max(size - 0.5, SMALLEST)
        text.set_fontsize(size)


def _numbers(one: Comparison) -> str:
    """Return ln B and the odds before and after in words."""
    if one.ln_bayes_factor is None or not one.established:
        return "not established"
    error = one.ln_bayes_factor_error or 0.0
    ln_odds = ln_posterior_odds(one)
    before = odds(math.log(one.prior_odds))
    after = "" if ln_odds is None else f", prior odds {before}, posterior odds {odds(ln_odds, error)}"
    return f"ln B = {ln_with_error(one.ln_bayes_factor, error)}{after}"


def _exposure(found: BuildUp, step: Step) -> str:
    return f"{trimmed(step.exposure)}{' ' + found.unit if found.unit else ''}"


def _mark_decades(axes: Axes, palette: Palette) -> None:
    """Draw powers of ten of B as faint lines, their odds at the right end."""
    low, high = (end / _LN_10 for end in axes.get_ylim())
    step = ruler_step(low, high, _MOST_MARKS)
    for place in range(math.ceil(low / step), math.floor(high / step) + 1):
        decade = place * step
        if decade != 0:
            axes.axhline(
                decade * _LN_10, color=palette.faint, linewidth=0.6, alpha=0.5, zorder=0, gid="decade"
            )
        axes.text(
            1.012, decade * _LN_10, mark_text(decade), transform=axes.get_yaxis_transform(), va="center",
            color=palette.muted, fontsize=8, gid="decade words",
        )  # fmt: skip
    axes.text(
        1.012,
        1.03,
        "B",
        transform=axes.transAxes,
        color=palette.muted,
        fontsize=9,
        va="bottom",
        gid="decade words",
    )


def _draw_failures(axes: Axes, found: BuildUp, palette: Palette) -> None:
    failed = [step.exposure for step in found.steps if _nobody_fits(step)]
    if not failed:
        return
    low, high = axes.get_ylim()
    axes.set_ylim(low - 0.14 * (high - low), high)
    base = axes.get_ylim()[0]
    axes.plot(
        failed, [base + 0.035 * (high - base)] * len(failed), "x", color=palette.ink, markersize=6,
        markeredgewidth=1.6, gid="no hypothesis fits",
    )  # fmt: skip
    text = axes.text(
        failed[-1], base + 0.075 * (high - base), _NOBODY, color=palette.ink, fontsize=9, ha="right",
        gid="failure words",
    )  # fmt: skip
    keep_inside(text, axes)


def _nobody_fits(step: Step) -> bool:
    return bool(step.adequacies) and all(one.fails for one in step.adequacies)


def build_up_page(found: BuildUp, palette: Palette = LIGHT) -> Figure:
    """Return a figure with the build-up of the evidence.

    Args:
        found: the steps.
        palette: the theme's colours.
    """
    from matplotlib.figure import Figure

    page = Figure(figsize=_SIZE, facecolor=palette.paper)
    _draw_on(page, found, palette)
    return page


def build_up_words(found: BuildUp) -> str:
    """Return the picture in words, with the numbers of its first and last step and of those that fail.

    Args:
        found: the steps.
    """
    if not found.steps:
        return f"Build-up of the evidence: {_NO_COUNTS}."
    shown = found.steps if len(found.steps) <= 2 else (found.steps[0], found.steps[-1])
    sentences = [f"{_row(found, step)}." for step in shown]
    failed = [_exposure(found, step) for step in found.steps if _nobody_fits(step)]
    unsure = [_exposure(found, step) for step in found.steps if not _stands(step)]
    if failed:
        sentences.append(f"At {', '.join(failed)} {_NOBODY}.")
    if unsure:
        sentences.append(f"Not established at {', '.join(unsure)}.")
    return f"Build-up of the evidence in {_number(len(found.steps), 'step')}. " + " ".join(sentences)


def _stands(step: Step) -> bool:
    return all(one.established for one in step.comparisons)


def _number(number: float, noun: str) -> str:
    return f"{count(number)} {noun}{'' if number == 1 else 's'}"


def _row(found: BuildUp, step: Step) -> str:
    """Return one step in a line."""
    each = [f"{shortened(one.hypothesis, 28)}: {_numbers(one)}" for one in step.comparisons]
    each += [
        f"{one.parameter} {trimmed(one.median)} (68 %: {trimmed(one.low)} to {trimmed(one.high)}) "
        f"if {shortened(one.hypothesis, 28)} holds"
        for one in step.strengths
    ]
    return f"{_exposure(found, step)}, {_number(step.events, 'event')}: " + "; ".join(each)


def _rows(figure: Figure, found: BuildUp) -> Rows:
    exposure = [step.exposure for step in found.steps]
    edges = [0.0, *(0.5 * (a + b) for a, b in pairwise(exposure))]
    edges += [1.02 * exposure[-1]] if exposure else []
    return Rows(figure.axes[0], tuple(edges), tuple(_row(found, step) for step in found.steps))


def _draw_on(figure: Figure, found: BuildUp, palette: Palette) -> None:
    lines = max((len(step.comparisons) for step in found.steps), default=1)
    height = 0.79 - 0.055 * lines
    draw_build_up(figure.add_axes((0.095, 0.125, 0.79, height)), found, palette)


_SIZE = (9.0, 4.4)
BUILD_UP = Sketch(_SIZE, _draw_on, build_up_words, _rows)
