"""The picture of backgrounds in doubt, read from its marks."""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise

import numpy as np
import pytest
from matplotlib.figure import Figure
from matplotlib.text import Text

from tests.records import hand_built_backgrounds as hand
from workbench.evidence.backgrounds import Backgrounds
from workbench.plots.backgrounds import draw_backgrounds, inches_for
from workbench.plots.page import WIDTH, backgrounds_page, picture_bytes
from workbench.plots.palette import DARK, LIGHT


def drawn(found: Backgrounds) -> Figure:
    page = Figure(figsize=(WIDTH, inches_for(found)))
    draw_backgrounds(page, found, LIGHT)
    page.draw_without_rendering()
    return page


def many(number: int) -> Backgrounds:
    """Return many alternatives with long names, all alike."""
    given = hand.found()
    names = tuple(
        f"a rather long name of shape {place}, which nobody would choose" for place in range(number)
    )
    fakes = tuple(replace(given.fakes[1], truth=truth, fitted=fitted) for truth in names for fitted in names)
    return replace(given, names=names, priors=(1.0 / number,) * number, weighing=None, fakes=fakes)


def test_the_bars_are_the_posterior_and_the_lines_the_prior_probabilities() -> None:
    probabilities, _, _ = drawn(hand.found()).axes
    bars = [mark.get_width() for mark in probabilities.patches if mark.get_gid() == "posterior"]  # type: ignore[attr-defined]
    assert bars == pytest.approx([0.98, 0.02, 0.6, 0.4])
    lines = [mark for mark in probabilities.lines if mark.get_gid() == "prior"]
    assert [np.asarray(line.get_xdata())[0] for line in lines] == [0.75, 0.25]


def test_the_points_are_ln_b_under_each_alternative_and_of_the_average() -> None:
    _, factors, _ = drawn(hand.found()).axes
    points = [np.asarray(mark.get_xydata())[0] for mark in factors.lines if mark.get_gid() == "ln B"]
    assert np.array(points) == pytest.approx(np.array([[7.21, 0.0], [10.71, 1.0], [7.715, 2.0]]))


def test_a_fake_stands_in_the_row_of_what_is_fitted_and_never_in_its_own() -> None:
    _, _, fakes = drawn(hand.found()).axes
    points = [np.asarray(mark.get_xydata())[0] for mark in fakes.lines if mark.get_gid() == "fake"]
    assert np.array(points) == pytest.approx(np.array([[0.62 / 0.31, 1.0], [-0.44 / 0.31, 0.0]]))


def test_what_is_not_established_is_said_instead_of_drawn() -> None:
    _, factors, _ = drawn(hand.unestablished()).axes
    said = [text.get_text() for text in factors.texts]
    assert said.count("not established") == 2  # one alternative, and the average
    assert len([mark for mark in factors.lines if mark.get_gid() == "ln B"]) == 1


@pytest.mark.parametrize("found", [hand.found(), many(2), many(9)], ids=["two", "two long", "nine long"])
def test_nothing_is_cut_off_and_row_names_do_not_meet(found: Backgrounds) -> None:
    page = drawn(found)
    frame = page.bbox
    undrawn = {
        label
        for axes in page.axes
        for label in axes.get_xticklabels()
        if not axes.get_xlim()[0] <= label.get_position()[0] <= axes.get_xlim()[1]
    }
    for text in page.findobj(Text):
        assert isinstance(text, Text)
        if text.get_text().strip() and text.get_visible() and text not in undrawn:
            box = text.get_window_extent()
            assert box.x0 >= frame.x0 - 0.5, text.get_text()
            assert box.x1 <= frame.x1 + 0.5, text.get_text()
            assert box.y0 >= frame.y0 - 0.5, text.get_text()
            assert box.y1 <= frame.y1 + 0.5, text.get_text()
    labels = page.axes[0].get_yticklabels()
    boxes = sorted((label.get_window_extent() for label in labels), key=lambda box: float(box.y0))
    assert all(below.y1 <= above.y0 + 0.5 for below, above in pairwise(boxes))


@pytest.mark.parametrize("palette", [LIGHT, DARK])
def test_a_page_can_be_saved_in_both_themes(palette: object) -> None:
    made = backgrounds_page(hand.outcome(), palette)  # type: ignore[arg-type]
    assert picture_bytes(made, "png").startswith(b"\x89PNG")
