"""Words on pictures: measured, kept inside, wrapped or shrunk, and moved apart."""

from __future__ import annotations

import re
import textwrap
from collections.abc import Sequence
from itertools import pairwise
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.text import Text

SMALLEST = 6.5  # points; smaller words are not read


def shortened(name: str, longest: int = 32) -> str:
    """Return a name short enough for a picture, its end replaced by an ellipsis where it is not."""
    line = " ".join(name.split())
    return (line if len(line) <= longest else line[: longest - 1].rstrip() + "…").replace("$", r"\$")


def wrapped(name: str, width: int = 18, lines: int = 3) -> str:
    """Return a name over several short lines, for a margin."""
    return "\n".join(textwrap.wrap(shortened(name, width * lines), width)) or " "


def typeset(text: str) -> str:
    """Return a text with its powers raised: "10^−14" and "fb^-1" as they are printed."""
    return re.sub(r"\^([-−]?\d+)", lambda power: f"$^{{{power[1].replace('−', '-')}}}$", text)


def extent(text: Text) -> tuple[float, float]:
    """Return the left and right end of a text [pixels]."""
    box = text.get_window_extent()
    return float(box.x0), float(box.x1)


def keep_inside(text: Text, axes: Axes, margin: float = 2.0) -> None:
    """Move a text sideways, and shrink or wrap it where that is not enough, so that nothing is cut off.

    Args:
        text: a text placed by its data coordinates.
        axes: what it has to stay inside of.
        margin: distance kept from the ends [pixels].
    """
    frame = axes.get_window_extent()
    room = frame.x1 - frame.x0 - 2.0 * margin
    left, right = extent(text)
    _shrink(text, room)
    left, right = extent(text)
    if right - left > room:
        words = text.get_text()
        share = max(int(len(words) * room / (right - left)) - 1, 8)
        text.set_text("\n".join(textwrap.wrap(words, share)))
        left, right = extent(text)
    shift = max(frame.x0 + margin - left, 0.0) or min(frame.x1 - margin - right, 0.0)
    if shift:
        along = axes.transData
        x, y = text.get_position()
        place = along.transform((x, y))
        text.set_x(float(along.inverted().transform((place[0] + shift, place[1]))[0]))


def keep_apart(left: Text, right: Text, axes: Axes) -> None:
    """Shrink, then shorten two texts at the two ends of axes until they do not meet."""
    frame = axes.get_window_extent()
    room: float = 0.47 * (frame.x1 - frame.x0)
    for text in (left, right):
        _shrink(text, room)
        arrow = " →" if text.get_text().endswith(" →") else ""
        name = text.get_text().removesuffix(arrow)
        while extent(text)[1] - extent(text)[0] > room and len(name) > 8:
            name = name[:-2].rstrip("… ") + "…"
            text.set_text(name + arrow)


def _shrink(text: Text, room: float) -> None:
    size = float(text.get_fontsize())
    while extent(text)[1] - extent(text)[0] > room and size > SMALLEST:
        size = max(size - 0.5, SMALLEST)
        text.set_fontsize(size)


def fill_block(text: Text, sentences: Sequence[str], axes: Axes, height: float) -> None:
    """Write sentences into a block as wide as the axes, small enough for its height.

    Args:
        text: an empty text at the block's centre.
        sentences: each begins a line of its own.
        axes: what it has to stay inside of.
        height: the block's height, as a part of the axes' height.
    """
    frame = axes.get_window_extent()
    size = float(text.get_fontsize())
    while True:
        text.set_fontsize(size)
        text.set_text("\n".join(sentences))
        left, right = extent(text)
        longest = max((len(sentence) for sentence in sentences), default=1)
        share = max(int(0.96 * longest * (frame.x1 - frame.x0) / max(right - left, 1.0)), 8)
        lines = [line for sentence in sentences for line in textwrap.wrap(sentence, share)]
        text.set_text("\n".join(lines))
        if _height(text) <= height * (frame.y1 - frame.y0):
            return
        if size <= SMALLEST:
            break
        size = max(size - 0.5, SMALLEST)
    while len(lines) > 1 and _height(text) > height * (frame.y1 - frame.y0):
        lines = lines[:-1]
        text.set_text("\n".join(lines) + "…")


def _height(text: Text) -> float:
    box = text.get_window_extent()
    return float(box.y1 - box.y0)


def spread(wanted: Sequence[float], sizes: Sequence[float], low: float, high: float) -> list[float]:
    """Return positions near the wanted ones at which things of some size do not overlap.

    Args:
        wanted: where each centre would like to be.
        sizes: how much room each takes.
        low: end of the room.
        high: other end of the room, above `low`.

    Returns:
        The centres, in the order given; they overlap only where the room is too small for all.
    """
    order = sorted(range(len(wanted)), key=lambda place: wanted[place])
    centres = list(wanted)
    floor = low
    for place in order:
        centres[place] = max(wanted[place], floor + 0.5 * sizes[place])
        floor = centres[place] + 0.5 * sizes[place]
    ceiling = high
    for place in reversed(order):
        centres[place] = min(centres[place], ceiling - 0.5 * sizes[place])
        ceiling = centres[place] - 0.5 * sizes[place]
    return centres


def text_height(axes: Axes, points: float) -> float:
    """Return how much of the y axis a line of words takes, room between lines included.

    Args:
        axes: with a straight y axis and its limits set.
        points: the words' size [points].
    """
    low, high = axes.get_ylim()
    figure = axes.get_figure(root=True)
    pixels = points * 1.35 * (figure.dpi if figure is not None else 100.0) / 72.0
    return pixels / float(axes.get_window_extent().height) * (high - low)


def overlaps(texts: Sequence[Text], gap: float = 6.0) -> bool:
    """Tell whether any two neighbouring texts come nearer than a gap [pixels]; given from left to right."""
    ends = [extent(text) for text in texts]
    return any(after[0] - before[1] < gap for before, after in pairwise(ends))
