"""The odds picture: prior odds, the step of the Bayes factor, posterior odds, on a ruler in powers of ten."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import TYPE_CHECKING

from workbench.ensembles.results import Adequacy
from workbench.evidence.results import Comparison, Evidence
from workbench.plots.palette import LIGHT, Palette
from workbench.plots.ruler import draw_ruler, ruler_range
from workbench.plots.words import fill_block, keep_apart, keep_inside, shortened, typeset
from workbench.records.numbers import factor, odds
from workbench.records.outcomes import spread_of_ln_bayes_factor
from workbench.records.sentences import adequacy_number, ln_posterior_odds, verdict_on_all

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.text import Text

_LN_10 = math.log(10.0)

# Every word has a lane of its own, so that words can't meet however the odds fall.
_ADEQUACY, _SIDES, _PRIOR, _FACTOR, _ARROW, _POSTERIOR, _RULER, _WHISKER = (
    0.93, 0.80, 0.69, 0.58, 0.505, 0.395, 0.275, 0.07,
)  # fmt: skip
# The drawing without odds has lanes of its own: the verdict, the ruler with the prior odds, and the reasons.
_VERDICT, _BARE_PRIOR, _BARE_RULER, _REASONS, _REASONS_HEIGHT = 0.67, 0.545, 0.43, 0.15, 0.29


def draw_odds(
    axes: Axes,
    comparison: Comparison,
    adequacies: Sequence[Adequacy],
    evidences: Sequence[Evidence] = (),
    palette: Palette = LIGHT,
    place: int = 1,
) -> None:
    """Draw one comparison on a ruler; where it is not established, say so and why instead.

    Args:
        axes: empty axes, at least some 5 by 2.5 inches; their frame is taken away.
        comparison: one hypothesis against the first.
        adequacies: one a hypothesis; those that fail are said first and loudly.
        evidences: one a hypothesis, for the reason where nothing is established.
        palette: the theme's colours.
        place: the hypothesis' place in file order, for its colour.
    """
    axes.set_axis_off()
    axes.figure.set_facecolor(palette.paper)
    axes.set_ylim(0.0, 1.0)
    concerned = [
        item for item in adequacies if item.hypothesis in {comparison.hypothesis, comparison.against}
    ]
    ln_odds = ln_posterior_odds(comparison)
    prior = math.log(comparison.prior_odds) / _LN_10
    if ln_odds is None:
        _draw_not_established(axes, comparison, evidences, prior, palette)
    else:
        _draw_established(axes, comparison, ln_odds, prior, palette, place)
    _draw_sides(axes, comparison, palette, place)
    _draw_adequacy(axes, concerned, palette)


def _draw_established(
    axes: Axes, comparison: Comparison, ln_odds: float, prior: float, palette: Palette, place: int
) -> None:
    posterior, error = ln_odds / _LN_10, (comparison.ln_bayes_factor_error or 0.0) / _LN_10
    spread = spread_of_ln_bayes_factor(comparison)
    whisker = None if spread is None else (spread[0] / _LN_10 + prior, spread[1] / _LN_10 + prior)
    values = [prior, posterior - error, posterior + error, *(whisker or ())]
    axes.set_xlim(*ruler_range(values))
    draw_ruler(axes, _RULER, palette)
    stroke = palette.hypothesis(place)
    if whisker is not None:
        _draw_whisker(axes, whisker, comparison, palette, place)
    _draw_step(axes, prior, posterior, comparison, palette)
    _draw_prior(axes, prior, comparison, palette)
    axes.plot(
        [posterior - error, posterior + error], [_RULER] * 2, color=stroke.line, linewidth=5.0, gid="error"
    )
    axes.plot([posterior], [_RULER], "o", color=stroke.line, markersize=10, zorder=5, gid="posterior odds")
    axes.plot([posterior, posterior], [_RULER, _ARROW], ":", color=palette.faint, linewidth=1.0, zorder=0)
    words = f"posterior odds  {odds(ln_odds, comparison.ln_bayes_factor_error)}"
    _write(axes, posterior, _POSTERIOR, words, stroke.words, 12, palette)


def _draw_whisker(
    axes: Axes, whisker: tuple[float, float], comparison: Comparison, palette: Palette, place: int
) -> None:
    low, high = whisker
    stroke = palette.hypothesis(place)
    axes.fill_between(
        [low, high], _RULER - 0.035, _RULER + 0.035, color=stroke.fill, linewidth=0, zorder=0.5, gid="whisker"
    )
    for end in whisker:
        axes.plot(
            [end, end], [_RULER - 0.05, _RULER + 0.05], color=stroke.line, linewidth=1.2, gid="whisker end"
        )
    names = " and ".join(shortened(item.parameter, 24) for item in comparison.sensitivity)
    ends = f"{odds(low * _LN_10, 0.0)} to {odds(high * _LN_10, 0.0)}"
    words = f"{ends}  when the prior of {names} is half or twice as wide"
    _write(axes, 0.5 * (low + high), _WHISKER, words, stroke.words, 9, palette)


def _draw_step(axes: Axes, prior: float, posterior: float, comparison: Comparison, palette: Palette) -> None:
    low, high = axes.get_xlim()
    if abs(posterior - prior) > 0.02 * (high - low):  # a shorter arrow is only a head
        axes.annotate(
            "",
            xy=(posterior, _ARROW),
            xytext=(prior, _ARROW),
            arrowprops={
                "arrowstyle": "-|>",
                "color": palette.ink,
                "linewidth": 1.8,
                "shrinkA": 0,
                "shrinkB": 0,
            },
            gid="step",
        )
    ln_factor = comparison.ln_bayes_factor or 0.0
    words = f"× Bayes factor  {factor(ln_factor, comparison.ln_bayes_factor_error)}"
    _write(axes, 0.5 * (prior + posterior), _FACTOR, words, palette.ink, 11, palette)


def _draw_prior(
    axes: Axes,
    prior: float,
    comparison: Comparison,
    palette: Palette,
    ruler: float = _RULER,
    height: float = _PRIOR,
) -> None:
    foot, head = ruler - 0.03, ruler + 0.06
    axes.plot([prior, prior], [foot, head], color=palette.ink, linewidth=3.0, gid="prior odds")
    axes.plot([prior, prior], [ruler, height - 0.03], ":", color=palette.faint, linewidth=1.0, zorder=0)
    words = f"prior odds  {odds(math.log(comparison.prior_odds))}"
    _write(axes, prior, height, words, palette.muted, 9, palette)


def _draw_sides(axes: Axes, comparison: Comparison, palette: Palette, place: int) -> None:
    low, high = axes.get_xlim()
    against, favour = palette.background.words, palette.hypothesis(place).words
    left = axes.text(
        low, _SIDES, f"← for {shortened(comparison.against)}", color=against, fontsize=10, va="center"
    )
    right = axes.text(
        high,
        _SIDES,
        f"for {shortened(comparison.hypothesis)} →",
        color=favour,
        fontsize=10,
        ha="right",
        va="center",
    )
    keep_apart(left, right, axes)


def _draw_adequacy(axes: Axes, adequacies: Sequence[Adequacy], palette: Palette) -> None:
    if not adequacies:
        return
    low, high = axes.get_xlim()
    numbers = "    ".join(f"{shortened(item.hypothesis)}: {adequacy_number(item)}" for item in adequacies)
    failing = [shortened(item.hypothesis) for item in adequacies if item.fails]
    if failing:
        verdict = verdict_on_all(adequacies) or f"{' and '.join(failing)} does not describe the data"
        words = axes.text(
            0.5 * (low + high),
            _ADEQUACY,
            f"{verdict.upper()}    {numbers}",
            color=palette.paper,
            weight="bold",
            fontsize=10,
            ha="center",
            va="center",
            gid="adequacy",
            bbox={"facecolor": palette.ink, "edgecolor": palette.ink, "boxstyle": "round,pad=0.5"},
        )
        keep_inside(words, axes, margin=12.0)
    else:
        words = axes.text(
            low,
            _ADEQUACY,
            f"adequacy    {numbers}",
            color=palette.muted,
            fontsize=9,
            va="center",
            gid="adequacy",
        )
        keep_inside(words, axes)


def _draw_not_established(
    axes: Axes, comparison: Comparison, evidences: Sequence[Evidence], prior: float, palette: Palette
) -> None:
    axes.set_xlim(*ruler_range([prior, -2.0, 2.0]))
    draw_ruler(axes, _BARE_RULER, palette, is_faint=True)
    _draw_prior(axes, prior, comparison, palette, _BARE_RULER, _BARE_PRIOR)
    low, high = axes.get_xlim()
    concerned = {comparison.hypothesis, comparison.against}
    reasons = [
        f"{shortened(item.hypothesis)}: {item.reason}"
        for item in evidences
        if item.hypothesis in concerned and not item.established
    ]
    words = axes.text(
        0.5 * (low + high),
        _VERDICT,
        "not established: no odds are given",
        color=palette.ink,
        fontsize=14,
        weight="bold",
        ha="center",
        va="center",
        gid="not established",
        bbox={
            "facecolor": palette.paper,
            "edgecolor": palette.ink,
            "boxstyle": "round,pad=0.5",
            "linewidth": 1.2,
        },
    )
    keep_inside(words, axes, margin=12.0)
    why = _write(axes, 0.5 * (low + high), _REASONS, "", palette.ink, 9, palette)
    fill_block(why, reasons, axes, _REASONS_HEIGHT)


def _write(axes: Axes, x: float, y: float, words: str, colour: str, size: float, palette: Palette) -> Text:
    text = axes.text(
        x,
        y,
        typeset(words),
        color=colour,
        fontsize=size,
        ha="center",
        va="center",
        zorder=6,
        bbox={"facecolor": palette.paper, "edgecolor": "none", "pad": 1.0},  # guides pass behind the words
    )
    keep_inside(text, axes)
    return text
