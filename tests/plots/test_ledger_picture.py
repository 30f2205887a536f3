"""The ledger's picture, read from its marks."""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise

import matplotlib as mpl
import numpy as np
import pytest
from matplotlib.axes import Axes
from matplotlib.colors import to_rgb
from matplotlib.figure import Figure
from matplotlib.patches import Rectangle
from matplotlib.text import Text

from tests.records import hand_built as hand
from tests.records import hand_built_ledger as built
from workbench.evidence.ledger.results import Account, Hold
from workbench.plots.ledger import MOST_HOLDS, draw_holds, draw_weights, inches_for
from workbench.plots.ledger_page import ledger_page
from workbench.plots.page import KINDS, picture_bytes
from workbench.plots.palette import DARK, LIGHT, Palette


def strip(account: Account, palette: Palette = LIGHT) -> Axes:
    figure = Figure(figsize=(9.0, 6.0))
    _, lower = draw_weights(figure, hand.analysis(), account, "peak", hand.fits(), palette)
    figure.draw_without_rendering()
    return lower


def bars(axes: Axes, name: str) -> list[Rectangle]:
    return [patch for patch in axes.patches if patch.get_gid() == name and isinstance(patch, Rectangle)]


def rows(account: Account) -> Axes:
    figure = Figure(figsize=(9.0, inches_for(account)))
    axes = figure.add_subplot()
    draw_holds(axes, account)
    figure.draw_without_rendering()
    return axes


def marks(axes: Axes, name: str) -> dict[float, float]:
    """Return row to ln B of one kind of mark."""
    found = [np.asarray(line.get_xydata()) for line in axes.lines if line.get_gid() == name]
    return {float(point[0][1]): float(point[0][0]) for point in found}


def test_each_bin_has_its_share_inside_its_loss() -> None:
    lower = strip(built.account())
    assert [bar.get_height() for bar in bars(lower, "share")] == pytest.approx(built.SHARES.tolist())
    assert [bar.get_height() for bar in bars(lower, "loss")] == pytest.approx(built.LOSSES.tolist())
    for share, loss in zip(bars(lower, "share"), bars(lower, "loss"), strict=True):
        assert loss.get_x() < share.get_x()
        assert share.get_x() + share.get_width() < loss.get_x() + loss.get_width()
        assert share.get_zorder() > loss.get_zorder()
    low, high = lower.get_ylim()
    assert low < built.LOSSES.min()
    assert high > built.LOSSES.max()


@pytest.mark.parametrize("palette", [LIGHT, DARK])
def test_share_and_loss_are_told_apart_in_grey(palette: Palette) -> None:
    lower = strip(built.account(), palette)
    grey = [
        float(np.dot(to_rgb(bars(lower, name)[0].get_facecolor()), (0.30, 0.59, 0.11)))
        for name in ("share", "loss")
    ]
    assert abs(grey[0] - grey[1]) > 0.15


def test_without_shares_only_losses_are_drawn_and_it_is_said() -> None:
    lower = strip(built.without_shares())
    assert bars(lower, "share") == []
    assert len(bars(lower, "loss")) == len(built.LOSSES) - 1
    assert any("not established" in text.get_text() for text in lower.texts)


def test_words_stay_on_the_page_and_apart() -> None:
    """With the longest names that are shown whole."""
    given = built.account()
    comparison = replace(
        given.comparison,
        hypothesis="a broad resonance nobody expected",
        against="background only as of today",
    )
    account = replace(given, comparison=comparison)
    figure = Figure(figsize=(9.0, 6.0))
    _, lower = draw_weights(figure, hand.analysis(), account, "peak", hand.fits())
    figure.draw_without_rendering()
    boxes = [text.get_window_extent() for text in lower.texts if text.get_gid() == "words"]
    assert len(boxes) == 4
    assert max(box.x1 for box in boxes) <= figure.bbox.x1
    for first in range(4):
        for second in range(first):
            assert not boxes[first].overlaps(boxes[second])


def test_each_uncertainty_is_a_pair_the_widest_on_top() -> None:
    axes = rows(built.account())
    labels = [label.get_text() for label in axes.get_yticklabels()]
    assert labels == ["continuum normalisation", "continuum scale", "muon efficiency", "fake composition"]
    assert marks(axes, "frozen") == pytest.approx({0.0: 8.104, 1.0: 7.702, 2.0: 7.718})
    assert marks(axes, "doubled") == pytest.approx({0.0: 6.521, 1.0: 7.733})
    assert [text.get_text().strip() for text in axes.texts] == ["not established"]
    (line,) = [one for one in axes.lines if one.get_gid() == "ln B"]
    assert float(np.asarray(line.get_xdata())[0]) == pytest.approx(built.VALUE)


def test_many_uncertainties_stay_readable() -> None:
    holds = tuple(Hold(f"source {one}", "source", 7.0, 0.01, 8.0, 0.01) for one in range(60))
    account = replace(built.account(), uncertainties=holds)
    axes = rows(account)
    assert len(axes.get_yticklabels()) == MOST_HOLDS
    heights = [label.get_window_extent() for label in axes.get_yticklabels()]
    assert all(not one.overlaps(other) for one, other in pairwise(heights))


@pytest.mark.parametrize("palette", [LIGHT, DARK])
def test_the_page_has_the_weights_and_the_uncertainties(palette: Palette) -> None:
    page = ledger_page(built.accounted(), palette)
    assert len(page.subfigs) == 2
    assert len(page.axes) == 3


def test_a_page_without_anything_says_so() -> None:
    page = ledger_page(built.missing())
    (words,) = [text for text in page.texts if isinstance(text, Text)]
    assert "nothing was accounted for" in words.get_text()


def test_drawing_changes_no_settings_and_every_kind_can_be_saved() -> None:
    before = dict(mpl.rcParams)
    page = ledger_page(built.accounted())
    assert all(len(picture_bytes(page, kind)) > 10_000 for kind in KINDS)
    assert dict(mpl.rcParams) == before
