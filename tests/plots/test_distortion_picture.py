"""The break point's picture, read from its marks."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from matplotlib.patches import StepPatch

from tests.records import broken
from tests.records import hand_built as hand
from workbench.evidence.breaking.results import BreakPoint
from workbench.plots.distortion import draw_distortion
from workbench.plots.page import KINDS, break_point_page, picture_bytes
from workbench.plots.palette import DARK, LIGHT, Palette


def steps(figure: Figure, gid: str) -> list[Any]:
    return [
        patch.get_data()
        for axes in figure.axes
        for patch in axes.patches
        if isinstance(patch, StepPatch) and patch.get_gid() == gid
    ]


@pytest.mark.parametrize("palette", [LIGHT, DARK])
def test_the_change_is_drawn_in_per_cent_over_the_bins(palette: Palette) -> None:
    page = break_point_page(broken.outcome(), palette)
    (change,), (distorted,) = steps(page, "change"), broken.break_point().distorted
    assert np.asarray(change.values) == pytest.approx(100.0 * distorted.change)
    edges = hand.analysis().regions[0].table.binning
    assert np.asarray(change.edges) == pytest.approx(np.append(edges.low, edges.high[-1]))


def test_the_signal_stands_where_it_is_and_inside_the_frame() -> None:
    (shape,) = steps(break_point_page(broken.outcome()), "signal")
    values, (distorted,) = np.asarray(shape.values), broken.break_point().distorted
    assert values / values.max() == pytest.approx(distorted.signal / distorted.signal.max())


@pytest.mark.parametrize("sign", [1.0, -1.0, 0.0])
def test_every_mark_lies_inside_whatever_the_sign(sign: float) -> None:
    (distorted,) = broken.break_point().distorted
    moved = replace(distorted, change=sign * np.abs(distorted.change))
    axes = Figure(figsize=(9.0, 3.6)).add_axes((0.09, 0.18, 0.72, 0.70))
    draw_distortion(axes, hand.analysis().regions[0], moved)
    low, high = axes.get_ylim()
    for patch in axes.patches:
        values = np.asarray(patch.get_data().values)  # type: ignore[attr-defined]
        assert low < min(values.min(), 0.0)
        assert max(values.max(), 0.0) < high


def test_no_words_are_cut_off() -> None:
    page = break_point_page(broken.outcome())
    canvas = FigureCanvasAgg(page)
    canvas.draw()  # type: ignore[no-untyped-call]
    width, height = canvas.get_width_height()
    words = [text for axes in page.axes for text in axes.texts]
    words += [text for axes in page.axes if (legend := axes.get_legend()) for text in legend.get_texts()]
    for text in words:
        box = text.get_window_extent()
        assert box.x0 >= 0.0
        assert box.x1 <= width
        assert box.y0 >= 0.0
        assert box.y1 <= height


@pytest.mark.parametrize(
    ("found", "words"),
    [
        (broken.break_point(), "too low by 3.1 %"),
        (broken.not_within(), "within 5 %"),
        (broken.below_already(), "nothing to break"),
        (broken.not_established(), "not established"),
    ],
)
def test_every_ending_is_said_and_can_be_saved(found: BreakPoint, words: str) -> None:
    page = break_point_page(broken.outcome(found))
    said = " ".join(" ".join(text.get_text() for axes in page.axes for text in axes.texts).split())
    assert words in said
    assert all(len(picture_bytes(page, kind)) > 3_000 for kind in KINDS)
