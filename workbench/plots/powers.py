"""Nuisance priors to powers: what each parameter rests on, and how ln B answers."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from workbench.evidence.prior_choice.power_scaling import THRESHOLD
from workbench.evidence.prior_choice.powers import PowerScaling
from workbench.plots.frame import clean_axes
from workbench.plots.palette import LIGHT, Palette
from workbench.plots.words import shortened

if TYPE_CHECKING:
    from matplotlib.axes import Axes


def draw_sensitivities(axes: Axes, scalings: Sequence[PowerScaling], palette: Palette = LIGHT) -> None:
    """Draw how far each posterior moves with its prior and with the likelihood, against the threshold.

    Args:
        axes: empty axes with room for names on the left.
        scalings: nuisance priors, from above to below.
        palette: the theme's colours.
    """
    _rows(axes, scalings, palette)
    for row, one in enumerate(scalings):
        axes.plot([one.by_prior, one.by_data], [-row, -row], color=palette.faint, linewidth=1.0, zorder=1)
        for value, error, filled, gid in (
            (one.by_prior, one.by_prior_error, True, "by prior"),
            (one.by_data, one.by_data_error, False, "by data"),
        ):
            axes.errorbar(
                [value],
                [-row],
                xerr=[error],
                fmt="s" if filled else "o",
                color=palette.ink,
                markerfacecolor=palette.ink if filled else palette.paper,
                markersize=5.5,
                elinewidth=1.0,
                zorder=3,
                gid=gid,
            )
    axes.axvline(THRESHOLD, color=palette.faint, linewidth=0.9, linestyle="--", zorder=0, gid="threshold")
    axes.set_xlim(left=-0.02 * axes.get_xlim()[1])
    axes.set_yticks(
        [-row for row in range(len(scalings))], [shortened(one.parameter, 24) for one in scalings]
    )
    axes.tick_params(axis="y", length=0, labelsize=8.5, labelcolor=palette.ink)
    words = "posterior moves per doubling of the power\n■ of its prior   ○ of the likelihood"
    axes.set_xlabel(words, fontsize=8.5)
    axes.xaxis.label.set_color(palette.ink)


def draw_power_changes(axes: Axes, scalings: Sequence[PowerScaling], palette: Palette = LIGHT) -> None:
    """Draw the change of ln B with each prior to the power 1/2 and 2, and what its parameter rests on.

    Args:
        axes: empty axes beside the other ones, with room for words on the right.
        scalings: nuisance priors, from above to below.
        palette: the theme's colours.
    """
    _rows(axes, scalings, palette)
    stroke = palette.signal
    for row, one in enumerate(scalings):
        for change in one.changes:
            if change.ln_change is None:
                continue
            axes.plot([0.0, change.ln_change], [-row, -row], color=stroke.fill, linewidth=3.0, zorder=1)
            axes.errorbar(
                [change.ln_change],
                [-row],
                xerr=[change.error or 0.0],
                fmt="<" if change.power < 1.0 else ">",
                color=stroke.line,
                markerfacecolor=palette.paper if change.power < 1.0 else stroke.line,
                markersize=6,
                elinewidth=1.0,
                zorder=3,
                gid="change",
            )
        axes.annotate(
            one.driver.value,
            (1.0, -row),
            xycoords=("axes fraction", "data"),
            xytext=(6, 0),
            textcoords="offset points",
            fontsize=8.5,
            va="center",
            color=palette.ink,
            annotation_clip=False,
            gid="rests on",
        )
    axes.axvline(0.0, color=palette.faint, linewidth=1.0, zorder=0)
    axes.set_yticks([])
    axes.spines["left"].set_visible(False)
    axes.set_xlabel("change of ln B\n◁ prior to the power ½, wider   ▶ 2, narrower", fontsize=8.5)
    axes.xaxis.label.set_color(palette.ink)


def _rows(axes: Axes, scalings: Sequence[PowerScaling], palette: Palette) -> None:
    clean_axes(axes, palette)
    axes.set_ylim(-len(scalings) + 0.4, 0.6)
