"""The triangle of three hypotheses, read from its marks."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from tests.records import hand_built as hand
from workbench.evidence.results import Posterior
from workbench.plots.page import weighing_page
from workbench.plots.palette import DARK, LIGHT, Palette
from workbench.plots.triangle import CORNERS, draw_triangle, place_of

NAMES = ("background only", "resonance", "neither")


def posteriors(*shares: float | None, names: tuple[str, ...] = NAMES) -> list[Posterior]:
    return [Posterior(name, 1.0 / 3.0, share, 0.01) for name, share in zip(names, shares, strict=True)]


def drawn(given: list[Posterior], palette: Palette = LIGHT) -> Axes:
    axes = Figure(figsize=(9.0, 3.6)).add_axes((0.03, 0.03, 0.94, 0.94))
    draw_triangle(axes, given, palette)
    return axes


def test_places_by_hand() -> None:
    """Certainty is a corner; even probabilities the centre; two halves the middle of a side."""
    for corner in range(3):
        assert place_of(np.eye(3)[corner]) == pytest.approx(CORNERS[corner])
    assert place_of([1 / 3, 1 / 3, 1 / 3]) == pytest.approx([0.5, np.sqrt(3.0) / 6.0])
    assert place_of([0.5, 0.5, 0.0]) == pytest.approx([0.5, 0.0])


def test_the_points_stand_where_the_probabilities_say() -> None:
    marks = {line.get_gid(): line.get_xydata() for line in drawn(posteriors(0.1, 0.3, 0.6)).lines}
    assert np.ravel(marks["prior"]) == pytest.approx(place_of([1 / 3, 1 / 3, 1 / 3]))
    assert np.ravel(marks["posterior"]) == pytest.approx(place_of([0.1, 0.3, 0.6]))


@pytest.mark.parametrize("palette", [LIGHT, DARK])
@pytest.mark.parametrize("shares", [(0.1, 0.3, 0.6), (1e-9, 1.0 - 2e-9, 1e-9), (1.0, 0.0, 0.0)])
def test_no_words_are_cut_off_or_on_each_other(shares: tuple[float, ...], palette: Palette) -> None:
    names = (
        "background only, as it was declared",
        "a broad resonance with a long name",
        "neither of the two",
    )
    axes = drawn(posteriors(*shares, names=names), palette)
    frame = axes.get_window_extent()
    boxes = [text.get_window_extent() for text in axes.texts if text.get_text()]
    for box in boxes:
        assert frame.x0 - 1.0 <= box.x0
        assert box.x1 <= frame.x1 + 1.0
    assert not any(one.overlaps(other) for place, one in enumerate(boxes) for other in boxes[:place])


def test_three_established_hypotheses_have_a_triangle_on_the_page_and_others_have_none() -> None:
    given = hand.weighed()
    two = weighing_page(given)
    for shares, more in (((0.1, 0.3, 0.6), 1), ((None, None, None), 0)):
        three = replace(given, weighing=replace(given.weighing, posteriors=tuple(posteriors(*shares))))
        assert len(weighing_page(three).subfigs) == len(two.subfigs) + more
