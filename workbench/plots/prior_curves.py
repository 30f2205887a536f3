"""ln B against the mean of the strength's prior, a curve a family, under the most that any prior makes."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
import numpy.typing as npt

from workbench.evidence.formulas.scales import Scale
from workbench.evidence.prior_choice.results import PriorSensitivity
from workbench.plots.frame import axis_of_doublings, clean_axes
from workbench.plots.palette import LIGHT, Palette
from workbench.plots.words import spread, text_height
from workbench.records.numbers import fixed

if TYPE_CHECKING:
    from matplotlib.axes import Axes

Array = npt.NDArray[np.float64]

DASHES: tuple[str | tuple[int, tuple[int, ...]], ...] = (
    (0, (1, 1)),
    (0, (4, 1)),
    (0, (6, 1, 1, 1)),
    "-",
    (0, (2, 1)),
    (0, (7, 2)),
    (0, (3, 1, 1, 1, 1, 1)),
    (0, (1, 2)),
)
_FAMILIES = {
    "uniform": "uniform",
    "exponential": "exponential",
    "halfnormal": "half-normal",
    "fixed": "point",
}


def draw_prior_curves(axes: Axes, found: PriorSensitivity, scale: Scale, palette: Palette = LIGHT) -> None:
    """Draw ln B of every family against the mean, the bounds above them, and the declared prior.

    Args:
        axes: empty axes with room for words on the right.
        found: an established examination.
        scale: whose boundaries are drawn.
        palette: the theme's colours.
    """
    clean_axes(axes, palette)
    axis_of_doublings(axes, float(found.means[0]), float(found.means[-1]))
    curves = {one.name: _values([a.ln_bayes_factor for a in one.averages]) for one in found.families}
    low, high = _heights(found, curves, scale)
    axes.set_ylim(low, high)
    for boundary in _inside([*scale.boundaries, *(-one for one in scale.boundaries)], low, high):
        axes.axhline(boundary, color=palette.faint, linewidth=0.6, zorder=0, gid="boundary")
    axes.axhline(0.0, color=palette.faint, linewidth=1.2, zorder=0)
    ends = {}
    for (name, values), dashes in zip(curves.items(), DASHES, strict=True):
        is_declared = name == declared_family(found)
        axes.plot(
            found.means,
            values,
            linestyle=dashes,
            color=palette.signal.line if is_declared else palette.ink,
            linewidth=1.8 if is_declared else 1.1,
            zorder=3 if is_declared else 2,
            gid=f"family {name}",
        )
        known = np.flatnonzero(np.isfinite(values))
        ends[name] = float(values[known[-1]]) if known.size and known[-1] == values.size - 1 else low
    _draw_bounds(axes, found, palette)
    _draw_declared(axes, found, palette)
    _name_curves(axes, ends, palette)
    axes.set_ylabel("ln Bayes factor", color=palette.ink)


def declared_family(found: PriorSensitivity) -> str:
    """Return the family that the declared prior is a member of; empty where it is of none."""
    is_from_zero = found.declared.family != "uniform" or found.declared.text.startswith("uniform from 0 ")
    return _FAMILIES.get(found.declared.family, "") if is_from_zero else ""


def _values(averages: list[float | None]) -> Array:
    return np.array([np.nan if one is None else one for one in averages])


def _heights(found: PriorSensitivity, curves: dict[str, Array], scale: Scale) -> tuple[float, float]:
    """Return ends that hold the bounds, the declared ln B and the curves as far down as a boundary lies."""
    bounds = [one.ln_bayes_factor for one in found.bounds]
    top = max(*bounds, found.comparison.ln_bayes_factor or 0.0, 1.0)
    wide = [values for name, values in curves.items() if name != "point"]
    lowest = min(float(np.nanmin(values)) for values in wide)
    bottom = min(max(lowest, -scale.boundaries[-1] - 1.5), -1.3)
    return bottom - 0.2, top + 0.08 * (top - bottom)


def _inside(values: list[float], low: float, high: float) -> list[float]:
    return [value for value in values if low < value < high]


def _draw_bounds(axes: Axes, found: PriorSensitivity, palette: Palette) -> None:
    """Draw each bound as a line with its name on it, from the left, names kept apart."""
    words = {
        "any prior": "any prior",
        "peak at the prediction": "a single peak at 1",
        "never rising": "never rising",
        "p-value": "−e p ln p, local p",
    }
    colour = palette.signal
    low, high = axes.get_ylim()
    wanted = [one.ln_bayes_factor for one in found.bounds]
    size = text_height(axes, 8.0)
    places = spread(wanted, [size] * len(wanted), low, high)
    for bound, place in zip(found.bounds, places, strict=True):
        style = "--" if bound.name == "p-value" else "-"
        axes.axhline(bound.ln_bayes_factor, color=colour.line, linewidth=1.0, linestyle=style, gid="bound")
        axes.annotate(
            f"largest, {words[bound.name]}: {fixed(bound.ln_bayes_factor, 2)}",
            (0.0, place),
            xycoords=("axes fraction", "data"),
            xytext=(4, 0),
            textcoords="offset points",
            color=colour.words,
            fontsize=8,
            va="center",
            gid="bound words",
            bbox={"facecolor": palette.paper, "edgecolor": "none", "pad": 0.8},
        )


def _draw_declared(axes: Axes, found: PriorSensitivity, palette: Palette) -> None:
    value = found.comparison.ln_bayes_factor
    if value is None:
        return
    axes.axvline(found.declared.mean, color=palette.signal.line, linewidth=0.8, zorder=0, gid="declared mean")
    axes.plot(
        [found.declared.mean],
        [value],
        "o",
        color=palette.signal.line,
        markeredgecolor=palette.paper,
        markersize=9,
        zorder=5,
        gid="declared",
    )


def _name_curves(axes: Axes, ends: dict[str, float], palette: Palette) -> None:
    low, high = axes.get_ylim()
    size = text_height(axes, 8.5)
    wanted = [min(max(value, low), high) for value in ends.values()]
    for name, place in zip(ends, spread(wanted, [size] * len(wanted), low, high), strict=True):
        axes.annotate(
            name,
            (1.0, place),
            xycoords=("axes fraction", "data"),
            xytext=(6, 0),
            textcoords="offset points",
            color=palette.ink,
            fontsize=8.5,
            va="center",
            annotation_clip=False,
            gid="family words",
        )
