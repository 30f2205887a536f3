"""The counts picture, read from its marks."""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise

import numpy as np
import pytest
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.text import Text

from tests.records import hand_built as hand
from workbench.counts.binning import Binning
from workbench.counts.table import Table
from workbench.hypotheses.analysis import Analysis
from workbench.likelihood.results import Array, Fit
from workbench.plots.counts import draw_counts, runs
from workbench.plots.palette import DARK, LIGHT, Palette
from workbench.plots.small_counts import excess, interval


def drawn(analysis: Analysis, fits: tuple[Fit, ...], palette: Palette = LIGHT) -> tuple[Axes, Axes]:
    return draw_counts(Figure(figsize=(9.0, 5.2)), analysis, "peak", fits, palette)


def line(axes: Axes, name: str) -> Array:
    """Return (point, 2) the points of one kind of mark."""
    (found,) = [mark for mark in axes.lines if mark.get_gid() == name]
    return np.asarray(found.get_xydata())


def other_bins(
    low: list[float], high: list[float], observed: list[float], scale: float
) -> tuple[Analysis, Fit]:
    """Return an analysis and a fit with other bins in the region."""
    analysis = hand.analysis()
    region = analysis.regions[0]
    columns = {name: np.ones(len(low)) for name in region.table.columns}
    table = Table(Binning(np.array(low), np.array(high)), np.array(observed), columns)
    fit = replace(
        hand.fits()[0], expected=np.asarray(scale * np.arange(1.0, len(low) + 1.0), dtype=np.float64)
    )
    return replace(analysis, regions=(replace(region, table=table),)), fit


def test_the_points_are_the_counts_with_intervals_that_hold_for_small_ones() -> None:
    upper, _ = drawn(hand.analysis(), hand.fits())
    points = line(upper, "observed")
    assert points[:, 1] == pytest.approx(hand.OBSERVED)
    (bars,) = [mark for mark in upper.collections if mark.get_gid() == "intervals"]
    ends = np.array([path.vertices[:, 1] for path in bars.get_paths()])  # type: ignore[index]
    assert pytest.approx(np.array(interval(hand.OBSERVED))) == ends.T


def test_each_hypothesis_is_a_step_without_walls() -> None:
    upper, _ = drawn(hand.analysis(), hand.fits())
    steps = {patch.get_gid(): patch for patch in upper.patches}
    assert set(steps) == {"hypothesis 0", "hypothesis 1"}
    values, edges, baseline = steps["hypothesis 1"].get_data()  # type: ignore[attr-defined]
    assert values == pytest.approx(hand.fits()[1].expected)
    assert edges == pytest.approx(hand.EDGES)
    assert baseline is None


def test_the_background_is_not_hidden_by_the_signal() -> None:
    upper, _ = drawn(hand.analysis(), hand.fits())
    below, above = sorted(upper.patches, key=lambda patch: patch.get_zorder())
    assert (below.get_gid(), above.get_gid()) == ("hypothesis 0", "hypothesis 1")
    assert below.get_linewidth() > above.get_linewidth() + 1.0


def test_the_excess_is_over_the_first_hypothesis() -> None:
    _, lower = drawn(hand.analysis(), hand.fits())
    expected = excess(hand.OBSERVED, hand.fits()[0].expected)
    assert line(lower, "excess")[:, 1] == pytest.approx(expected)
    assert lower.get_ylim()[0] < expected.min()


def test_steps_are_broken_at_gaps() -> None:
    binning = Binning(np.array([0.0, 1.0, 5.0, 6.0]), np.array([1.0, 2.0, 6.0, 7.0]))
    assert runs(binning) == [slice(0, 2), slice(2, 4)]
    analysis, fit = other_bins([0.0, 1.0, 5.0, 6.0], [1.0, 2.0, 6.0, 7.0], [1.0, 2.0, 3.0, 4.0], 1.0)
    upper, _ = drawn(analysis, (fit,))
    assert len(upper.patches) == 2


def test_unequal_bins_are_drawn_per_unit_of_width() -> None:
    analysis, fit = other_bins([0.0, 1.0, 3.0], [1.0, 3.0, 8.0], [4.0, 6.0, 10.0], 2.0)
    upper, _ = drawn(analysis, (fit,))
    assert line(upper, "observed")[:, 1] == pytest.approx([4.0, 3.0, 2.0])
    assert upper.get_ylabel() == "events / GeV"


def test_a_steep_spectrum_gets_a_logarithmic_axis() -> None:
    analysis, fit = other_bins([0.0, 1.0], [1.0, 2.0], [5000.0, 0.0], 1.0)
    upper, _ = drawn(analysis, (replace(fit, expected=np.array([5000.0, 2.0])),))
    assert upper.get_yscale() == "log"
    assert len(line(upper, "observed")) == 1


def test_an_impossible_count_is_marked_at_the_edge() -> None:
    analysis, fit = other_bins([0.0, 1.0], [1.0, 2.0], [3.0, 2.0], 1.0)
    _, lower = drawn(analysis, (replace(fit, expected=np.array([3.0, 0.0])),))
    assert line(lower, "excess outside")[:, 0] == pytest.approx([1.5])


def test_a_plan_has_no_points() -> None:
    analysis = hand.analysis()
    region = analysis.regions[0]
    planned = replace(analysis, regions=(replace(region, table=replace(region.table, observed=None)),))
    upper, _ = drawn(planned, hand.fits())
    assert [mark.get_gid() for mark in upper.lines] == []


@pytest.mark.parametrize("palette", [LIGHT, DARK])
def test_every_mark_is_named_in_the_margin_and_no_name_is_on_another(palette: Palette) -> None:
    upper, _ = drawn(hand.analysis(), hand.fits(), palette)
    figure = upper.get_figure()
    assert isinstance(figure, Figure)
    figure.draw_without_rendering()  # words that lead to a mark are placed when drawn
    names = {text.get_text(): Text.get_window_extent(text) for text in upper.texts}
    assert set(names) == {"background only", "resonance", "observed\n68 % intervals"}
    boxes = sorted(names.values(), key=lambda box: box.y0)
    assert all(below.y1 <= above.y0 for below, above in pairwise(boxes))
    assert max(box.x1 for box in boxes) <= figure.bbox.x1
    assert min(box.x0 for box in boxes) >= upper.get_window_extent().x1
