"""The picture of an updating ratio: a curve over one parameter, or steps of one hue over two."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import TYPE_CHECKING

import numpy as np

from workbench.evidence.ratio.reading import Profile, Sheet
from workbench.evidence.ratio.results import Scan
from workbench.plots.frame import clean_axes
from workbench.plots.palette import LIGHT, Palette
from workbench.plots.ruler import ruler_step
from workbench.plots.words import keep_inside, shortened, typeset
from workbench.records.numbers import factor, significant

if TYPE_CHECKING:
    from matplotlib.axes import Axes

_LN_10 = math.log(10.0)
_LOWEST = -6.0  # decades below 1 that a curve is shown for
_MOST_STEPS = 9
_EVEN, _DARKEST = 0.38, 0.92
_ONE_STEP = 0.6
_DARK_FROM = 3.0  # decades above 1 at which the hue is as dark as it gets
_FEW_DECADES = 2.5


def draw_curve(axes: Axes, found: Scan, read: Profile, palette: Palette = LIGHT) -> None:
    """Draw R over one parameter, above 1 in the signal's colour and below 1 in the background's.

    Args:
        axes: empty axes, at least some 5 by 3 inches.
        found: the scan, for its peak and its names.
        read: R along its parameter.
        palette: the theme's colours.
    """
    clean_axes(axes, palette)
    decades = np.maximum(read.ln_ratio / _LN_10, _LOWEST - 1.0)
    error = read.error / _LN_10
    values, ln_ratio, ln_error = found.peak
    top = ln_ratio / _LN_10
    low, high = max(float(decades.min()), _LOWEST), max(top, 0.0)
    room = 0.16 * max(high - low, 1.0)
    axes.set_xlim(float(read.values[0]), float(read.values[-1]))
    axes.set_ylim(low - 0.3 * room, high + room)
    for stroke, is_there in ((palette.signal, decades >= 0.0), (palette.background, decades <= 0.0)):
        axes.fill_between(
            read.values, 0.0, decades, where=is_there.tolist(), color=stroke.fill, linewidth=0.0,
            interpolate=True, gid="side",
        )  # fmt: skip
    axes.fill_between(
        read.values, decades - error, decades + error, color=palette.signal.line, alpha=0.35, linewidth=0.0,
        gid="error",
    )  # fmt: skip
    axes.plot(read.values, decades, color=palette.signal.line, linewidth=1.4, gid="curve")
    axes.axhline(0.0, color=palette.ink, linewidth=1.0, gid="even")
    place = values[read.parameter]
    axes.plot([place], [top], "o", color=palette.signal.line, markersize=6, gid="peak")
    words = f"{_at(values, found.units)}: R = {factor(ln_ratio, ln_error)}"
    text = axes.text(
        place, top + 0.35 * room, typeset(words), color=palette.signal.words, fontsize=9, ha="center",
        va="bottom", gid="peak words",
    )  # fmt: skip
    keep_inside(text, axes)
    _mark_decades(axes, low, high, palette)
    axes.set_xlabel(_label(read.parameter, found.units), color=palette.ink, fontsize=10)
    _head(axes, found, palette)


def draw_sheet(axes: Axes, found: Scan, read: Sheet, palette: Palette = LIGHT) -> None:
    """Draw R over two parameters in steps of one hue, darker where it is larger, R = 1 as a line.

    Args:
        axes: empty axes, at least some 5 by 4 inches.
        found: the scan, for its peak and its names.
        read: R over its parameters.
        palette: the theme's colours.
    """
    clean_axes(axes, palette)
    decades = read.ln_ratio / _LN_10
    values, ln_ratio, ln_error = found.peak
    levels = _levels(float(decades.min()), max(ln_ratio / _LN_10, 0.0))
    colours = [_mixed(palette.paper, palette.signal.line, _darkness(level, levels)) for level in levels]
    steps = axes.contourf(
        read.x,
        read.y,
        decades,
        levels=[*levels, max(levels[-1], float(decades.max())) + 1.0],
        colors=[palette.paper, *colours],
        extend="min",
    )
    steps.set_gid("steps")
    if decades.min() < 0.0 < decades.max():
        line = axes.contour(
            read.x, read.y, decades, levels=[0.0], colors=[palette.ink], linewidths=1.0, linestyles="--"
        )
        line.set_gid("even")
    x, y = values[read.across], values[read.up]
    axes.plot([x], [y], "+", color=palette.paper, markersize=11, markeredgewidth=3.6, gid="peak halo")
    axes.plot([x], [y], "+", color=palette.ink, markersize=9, markeredgewidth=1.6, gid="peak")
    text = axes.text(
        x, axes.get_ylim()[1], typeset(f"{_at(values, found.units)}: R = {factor(ln_ratio, ln_error)}"),
        color=palette.signal.words, fontsize=9, ha="center", va="bottom", gid="peak words",
    )  # fmt: skip
    keep_inside(text, axes)
    axes.set_xlabel(_label(read.across, found.units), color=palette.ink, fontsize=10)
    axes.set_ylabel(_label(read.up, found.units), color=palette.ink, fontsize=10)
    _key(axes, levels, colours, palette)
    _head(axes, found, palette, 24.0)


def _key(axes: Axes, levels: list[float], colours: list[str], palette: Palette) -> None:
    """Draw what each step of the hue stands for, beside the axes."""
    width = 0.025
    for place, (level, colour) in enumerate(zip(levels, colours, strict=True)):
        low, high = place / len(levels), (place + 1) / len(levels)
        axes.fill_between(
            [1.03, 1.03 + width], low, high, color=colour, linewidth=0.0, transform=axes.transAxes,
            clip_on=False, gid="key",
        )  # fmt: skip
        axes.text(
            1.04 + width, low, _power(level), transform=axes.transAxes, color=palette.muted, fontsize=8,
            va="center", gid="key words",
        )  # fmt: skip
    axes.plot(
        [1.03, 1.03, 1.03 + width, 1.03 + width, 1.03], [0.0, 1.0, 1.0, 0.0, 0.0], color=palette.faint,
        linewidth=0.6, transform=axes.transAxes, clip_on=False, gid="key frame",
    )  # fmt: skip
    axes.text(1.03, 1.03, "R above", transform=axes.transAxes, color=palette.ink, fontsize=9, gid="key title")
    axes.text(
        1.03, -0.085, "– – –  R = 1", transform=axes.transAxes, color=palette.ink, fontsize=8, gid="key words"
    )


def _head(axes: Axes, found: Scan, palette: Palette, above: float = 8.0) -> None:
    """Write what is compared, and what was averaged over, above the axes."""
    names = f"Updating ratio R: {shortened(found.hypothesis, 34)} against {shortened(found.against, 34)}"
    lines = [names]
    if found.averaged:
        rest = ", ".join(f"{shortened(name, 24)} {prior.text()}" for name, prior in found.averaged.items())
        lines.append(f"averaged over {rest}")
    if not found.established:
        lines.append("NOT ESTABLISHED")
    axes.set_title("\n".join(lines), loc="left", color=palette.ink, fontsize=10, pad=above)


def _mark_decades(axes: Axes, low: float, high: float, palette: Palette) -> None:
    step = ruler_step(low, high)
    first, last = math.ceil(low / step), math.floor(high / step)
    decades = [place * step for place in range(first, last + 1)]
    axes.set_yticks(decades, [_power(decade) for decade in decades])
    axes.set_ylabel("R", color=palette.ink, fontsize=10, rotation=0, labelpad=12)


def _power(decade: float) -> str:
    """Return 10 to a power as it is read: 0.01, 1, 1,000, beyond that with its exponent."""
    if decade == 0.0:
        return "1"
    if float(decade).is_integer() and -3 <= decade <= 5:
        return f"{10.0**decade:,.0f}" if decade > 0 else f"{10.0**decade:.{-int(decade)}f}"
    return f"$10^{{{decade:g}}}$" if float(decade).is_integer() else significant(10.0**decade, 2)


def _levels(low: float, high: float) -> list[float]:
    """Return ascending steps of log10 R: 1 among them, the first not below what is seen."""
    low = max(low, -4.0 if high < 4.0 else -2.0)
    if high - low < _FEW_DECADES:
        step = 0.5 if high - low > 1.0 else 0.1
    else:
        step = float(ruler_step(low, high, _MOST_STEPS))
    first = math.ceil(low / step)
    last = max(math.ceil(high / step) - 1, 0)
    return [step * place for place in range(min(first, last - 1), last + 1)]


def _darkness(level: float, levels: list[float]) -> float:
    """Return how dark a step is: below 1 light whatever there is, above darker with the decades."""
    if level < 0.0:
        return _EVEN * (1.0 - level / (levels[0] - _ONE_STEP))
    return _EVEN + (_DARKEST - _EVEN) * level / max(levels[-1], _DARK_FROM)


def _mixed(light: str, dark: str, share: float) -> str:
    """Return a colour between two, as "#rrggbb"."""
    parts = [(int(light[k : k + 2], 16), int(dark[k : k + 2], 16)) for k in (1, 3, 5)]
    return "#" + "".join(f"{round(a + share * (b - a)):02x}" for a, b in parts)


def _at(values: Mapping[str, float], units: Mapping[str, str]) -> str:
    found = []
    for name, value in values.items():
        unit = units.get(name, "")
        found.append(f"{shortened(name, 20)} {significant(value, 4)}{' ' + unit if unit else ''}")
    return ", ".join(found)


def _label(name: str, units: Mapping[str, str]) -> str:
    unit = units.get(name, "")
    return typeset(f"{shortened(name)} [{unit}]" if unit else shortened(name))
