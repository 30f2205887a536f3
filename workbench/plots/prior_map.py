"""The map of verdicts: for every family and mean, which boundaries of a published scale ln B has passed."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import pairwise
from typing import TYPE_CHECKING

from workbench.evidence.formulas.scales import Scale
from workbench.evidence.prior_choice.results import PriorSensitivity
from workbench.evidence.prior_choice.verdicts import FamilyCurve
from workbench.plots.frame import axis_of_doublings, clean_axes
from workbench.plots.palette import LIGHT, Palette
from workbench.plots.prior_curves import declared_family
from workbench.plots.words import shortened
from workbench.records.numbers import as_written, fixed

if TYPE_CHECKING:
    from matplotlib.axes import Axes


_HEIGHT = 0.84
_GAP = 0.5


def draw_prior_map(axes: Axes, found: PriorSensitivity, scale: Scale, palette: Palette = LIGHT) -> None:
    """Draw each family as a row of stretches, darker the further ln B is in favour of the hypothesis.

    Args:
        axes: empty axes with room for the families' names on the left.
        found: an established examination.
        scale: whose boundaries part the stretches.
        palette: the theme's colours.
    """
    clean_axes(axes, palette)
    axis_of_doublings(axes, float(found.means[0]), float(found.means[-1]))
    boundaries = both_sides(scale)
    colours = palette.steps(len(boundaries) + 1)
    bounds = [one for one in found.bounds if one.low is not None]
    names: list[tuple[float, str]] = []
    for row, bound in enumerate(bounds):
        ends = axes.get_xlim()
        step = grade(bound.ln_bayes_factor, boundaries)
        _draw_stretch(axes, -row, ends, colours[step], palette)
        axes.annotate(
            fixed(bound.ln_bayes_factor, 2),
            (0.5, -row),
            xycoords=("axes fraction", "data"),
            ha="center",
            va="center",
            fontsize=8,
            color=palette.paper if step >= len(boundaries) - 1 else palette.ink,
            gid="bound words",
        )
        names.append((-row, f"largest, {_CLASSES[bound.name]}"))
    for row, family in enumerate(found.families):
        place = -(row + len(bounds) + _GAP)
        for ends, value in stretches(found, family, scale, boundaries):
            _draw_stretch(axes, place, ends, colours[value], palette)
        names.append((place, family.name))
    axes.set_ylim(names[-1][0] - 0.6, 0.6)
    axes.set_yticks([place for place, _ in names], [name for _, name in names])
    axes.tick_params(axis="y", length=0, labelsize=8.5, labelcolor=palette.ink)
    axes.spines["left"].set_visible(False)
    _draw_declared(axes, found, {name: place for place, name in names}, palette)


_CLASSES = {"any prior": "any prior", "peak at the prediction": "peak at 1", "never rising": "never rising"}


def both_sides(scale: Scale) -> list[float]:
    """Return a scale's boundaries for and against, ascending [nats]."""
    return [*(-one for one in reversed(scale.boundaries)), *scale.boundaries]


def grade(ln_bayes_factor: float, boundaries: Sequence[float]) -> int:
    """Return how many boundaries lie at or below ln B."""
    return sum(ln_bayes_factor >= one for one in boundaries)


def stretches(
    found: PriorSensitivity, family: FamilyCurve, scale: Scale, boundaries: Sequence[float]
) -> list[tuple[tuple[float, float], int]]:
    """Return a family's stretches of the mean with the grade of each.

    Args:
        found: the examination.
        family: one of its families.
        scale: the scale whose crossings part the stretches.
        boundaries: its boundaries for and against, ascending.
    """
    crossed = sorted(
        (one for one in found.crossings[scale.name] if one.family == family.name), key=lambda one: one.mean
    )
    first = family.averages[0].ln_bayes_factor
    value = 0 if first is None else grade(first, boundaries)
    ends = [float(found.means[0]), *(one.mean for one in crossed), float(found.means[-1])]
    grades = [value]
    for one in crossed:
        value += 1 if one.is_rising else -1
        grades.append(value)
    return list(zip(pairwise(ends), grades, strict=True))


def _draw_stretch(axes: Axes, place: float, ends: tuple[float, float], colour: str, palette: Palette) -> None:
    axes.fill_between(
        ends,
        place - 0.5 * _HEIGHT,
        place + 0.5 * _HEIGHT,
        facecolor=colour,
        edgecolor=palette.ink,
        linewidth=0.5,
        gid="stretch",
    )


def _draw_declared(axes: Axes, found: PriorSensitivity, rows: dict[str, float], palette: Palette) -> None:
    mean = found.declared.mean
    axes.axvline(mean, color=palette.ink, linewidth=0.9, linestyle=":", gid="declared mean")
    row = rows.get(declared_family(found))
    if row is not None:
        axes.plot(
            [mean],
            [row],
            "o",
            color=palette.paper,
            markeredgecolor=palette.ink,
            markeredgewidth=1.8,
            markersize=9,
            zorder=5,
            gid="declared",
        )


def draw_prior_key(axes: Axes, found: PriorSensitivity, scale: Scale, palette: Palette = LIGHT) -> None:
    """Draw what the map's steps of lightness mean: a bar with the boundaries written under it.

    Args:
        axes: empty axes, wide and low; their frame is taken away.
        found: the examination.
        scale: whose boundaries they are.
        palette: the theme's colours.
    """
    axes.set_axis_off()
    boundaries = both_sides(scale)
    colours = palette.steps(len(boundaries) + 1)
    axes.set_xlim(0.0, len(colours))
    axes.set_ylim(0.0, 1.0)
    for place, colour in enumerate(colours):
        axes.fill_between(
            [place, place + 1], 0.45, 0.8, facecolor=colour, edgecolor=palette.ink, linewidth=0.5, gid="key"
        )
    for place, boundary in enumerate(boundaries, start=1):
        axes.text(
            place, 0.34, as_written(round(boundary, 2)), ha="center", va="top", fontsize=8, color=palette.ink
        )
    left = f"← for {shortened(found.comparison.against)}"
    right = f"for {shortened(found.comparison.hypothesis)} →"
    axes.text(0.0, 0.12, left, ha="left", va="top", fontsize=8, color=palette.muted)
    axes.text(len(colours), 0.12, right, ha="right", va="top", fontsize=8, color=palette.muted)
    title = f"ln Bayes factor, at the boundaries of {scale.name}"
    axes.text(0.0, 0.86, title, ha="left", va="bottom", fontsize=8.5, color=palette.ink)
