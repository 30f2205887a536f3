"""The triangle of three hypotheses: where the probability was before the counts, and where it is after."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np
import numpy.typing as npt

from workbench.evidence.results import Posterior
from workbench.plots.palette import LIGHT, Palette
from workbench.plots.words import keep_inside, shortened, typeset
from workbench.records.numbers import probability

if TYPE_CHECKING:
    from matplotlib.axes import Axes

Array = npt.NDArray[np.float64]

# First hypothesis at the left, second at the right, third at the top: sides of length 1.
CORNERS = np.array([[0.0, 0.0], [1.0, 0.0], [0.5, 0.5 * math.sqrt(3.0)]])
_NAMES_AT = ((-0.05, 0.02, "right"), (1.05, 0.02, "left"), (0.5, 0.95, "center"))
_SIDE = 1.45  # half of the width that is shown, the triangle's side being 1


def place_of(shares: Sequence[float]) -> Array:
    """Return where three probabilities stand in the triangle: the corners' mean, weighted with them.

    Args:
        shares: three probabilities that add up to 1.

    Returns:
        (2,) x and y, the triangle's side being 1.

    Source:
        none, definition: barycentric coordinates.
    """
    return np.asarray(np.asarray(shares, dtype=float) @ CORNERS)


def draw_triangle(axes: Axes, posteriors: Sequence[Posterior], palette: Palette = LIGHT) -> None:
    """Draw prior and posterior probabilities of three hypotheses as two points in a triangle.

    Args:
        axes: empty axes, at least some 6 by 3 inches; their frame is taken away.
        posteriors: three, in file order, all established.
        palette: the theme's colours.
    """
    axes.set_axis_off()
    axes.figure.set_facecolor(palette.paper)
    axes.set(xlim=(0.5 - _SIDE, 0.5 + _SIDE), ylim=(-0.12, 1.06), aspect="equal")
    _draw_frame(axes, palette)
    before = place_of([one.prior for one in posteriors])
    after = place_of([one.probability or 0.0 for one in posteriors])
    axes.annotate(
        "",
        xy=(float(after[0]), float(after[1])),
        xytext=(float(before[0]), float(before[1])),
        arrowprops={
            "arrowstyle": "-|>",
            "color": palette.muted,
            "linewidth": 1.4,
            "shrinkA": 5,
            "shrinkB": 7,
        },
        gid="step",
    )
    axes.plot(
        *before, "o", markersize=8, markerfacecolor=palette.paper, markeredgecolor=palette.ink, gid="prior"
    )
    axes.plot(*after, "o", markersize=10, color=palette.ink, gid="posterior")
    _name_corners(axes, posteriors, palette)
    words = "ring: prior probabilities;  point: after the counts;  lines: a half"
    legend = axes.text(0.5, -0.1, words, ha="center", va="center", fontsize=8.5, color=palette.muted)
    keep_inside(legend, axes)


def _draw_frame(axes: Axes, palette: Palette) -> None:
    ring = np.vstack([CORNERS, CORNERS[:1]])
    axes.plot(ring[:, 0], ring[:, 1], color=palette.faint, linewidth=1.4, gid="frame")
    for corner in range(3):
        others = [0.5 * (CORNERS[corner] + CORNERS[other]) for other in range(3) if other != corner]
        ends = np.array(others)
        axes.plot(ends[:, 0], ends[:, 1], ":", color=palette.faint, linewidth=0.9, gid="half")


def _name_corners(axes: Axes, posteriors: Sequence[Posterior], palette: Palette) -> None:
    for place, (one, (x, y, side)) in enumerate(zip(posteriors, _NAMES_AT, strict=True)):
        rest = sum(other.probability or 0.0 for other in posteriors if other is not one)
        number = probability(one.probability or 0.0, rest, one.error)
        name = shortened(one.hypothesis, 28)
        gap = "   " if side == "center" else "\n"
        words = axes.text(
            x,
            y,
            typeset(f"{name}{gap}{number}"),
            color=palette.hypothesis(place).words,
            fontsize=10,
            ha=side,
            va="center",
            gid="corner",
        )
        keep_inside(words, axes)
