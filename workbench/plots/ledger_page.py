"""The page of the ledger: counts with their weights, and the uncertainties, account by account."""

from __future__ import annotations

from typing import TYPE_CHECKING

from workbench.evidence.ledger.results import Account
from workbench.plots.ledger import draw_holds, draw_weights, inches_for
from workbench.plots.page import WIDTH
from workbench.plots.palette import LIGHT, Palette
from workbench.records.outcomes import LedgerOutcome

if TYPE_CHECKING:
    from matplotlib.figure import Figure

_WEIGHTS_HEIGHT = 6.0


def ledger_page(outcome: LedgerOutcome, palette: Palette = LIGHT) -> Figure:
    """Return a figure with the weights of every region's bins and the uncertainties, account by account.

    Args:
        outcome: what `ledger` found.
        palette: the theme's colours.
    """
    from matplotlib.figure import Figure

    analysis = outcome.analysis
    places = {one.name: place for place, one in enumerate(analysis.hypotheses)}
    panels: list[tuple[float, Account, str]] = []
    for account in outcome.ledger.accounts:
        panels += [(_WEIGHTS_HEIGHT, account, region.name) for region in analysis.regions if account.bins]
        panels += [(inches_for(account), account, "")] if account.uncertainties else []
    if not panels:
        return _empty_page("nothing was accounted for, bin by bin or by uncertainty", palette)
    heights = [height for height, _, _ in panels]
    page = Figure(figsize=(WIDTH, sum(heights)), facecolor=palette.paper)
    parts = page.subfigures(len(panels), 1, height_ratios=heights, squeeze=False)[:, 0]
    for part, (height, account, region_name) in zip(parts, panels, strict=True):
        place = places[account.comparison.hypothesis]
        if region_name:
            draw_weights(part, analysis, account, region_name, outcome.fits, palette, place)
        else:
            axes = part.add_axes((0.27, 0.7 / height, 0.66, 1.0 - 1.15 / height))
            draw_holds(axes, account, palette, place)
    return page


def _empty_page(words: str, palette: Palette) -> Figure:
    """Return a page that says why it is empty."""
    from matplotlib.figure import Figure

    page = Figure(figsize=(WIDTH, 1.0), facecolor=palette.paper)
    page.text(0.5, 0.5, words, color=palette.muted, ha="center", va="center")
    return page
