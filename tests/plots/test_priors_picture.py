"""The pictures of priors, read from their marks."""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise

import matplotlib as mpl
import numpy as np
import pytest
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.colors import to_hex
from matplotlib.figure import Figure
from matplotlib.text import Text

from tests.plots.test_palette import lightness
from tests.records import hand_built_priors as hand
from workbench.evidence.formulas.scales import JEFFREYS, KASS_RAFTERY, Scale
from workbench.evidence.prior_choice.powers import most_moving
from workbench.evidence.prior_choice.results import PriorSensitivity
from workbench.plots.palette import DARK, LIGHT, Palette
from workbench.plots.powers import draw_power_changes, draw_sensitivities
from workbench.plots.prior_curves import draw_prior_curves
from workbench.plots.prior_map import both_sides, draw_prior_map, grade, stretches
from workbench.plots.priors_page import priors_page

FOUND = hand.examination()


def axes_of(size: tuple[float, float] = (7.0, 3.5)) -> Axes:
    return Figure(figsize=size).add_axes((0.25, 0.2, 0.55, 0.7))


def of_kind(axes: Axes, gid: str) -> list[list[float]]:
    return [np.asarray(line.get_xdata()).tolist() for line in axes.lines if line.get_gid() == gid]


def test_the_declared_prior_stands_at_its_mean_and_ln_b() -> None:
    axes = axes_of()
    draw_prior_curves(axes, FOUND, KASS_RAFTERY)
    (point,) = [line for line in axes.lines if line.get_gid() == "declared"]
    assert np.asarray(point.get_xdata()).tolist() == [2.5]
    assert np.asarray(point.get_ydata()).tolist() == [FOUND.comparison.ln_bayes_factor]


def test_each_family_has_its_curve_and_its_name() -> None:
    axes = axes_of()
    draw_prior_curves(axes, FOUND, KASS_RAFTERY)
    drawn = {str(line.get_gid()).removeprefix("family "): line for line in axes.lines}
    for family in FOUND.families:
        values = np.asarray(drawn[family.name].get_ydata(), dtype=float)
        known = [one.ln_bayes_factor for one in family.averages]
        assert values[3] == known[3]
        assert int(np.isnan(values).sum()) == known.count(None)
    words = {text.get_text() for text in axes.texts if text.get_gid() == "family words"}
    assert words == {family.name for family in FOUND.families}


def test_bounds_are_lines_at_their_heights() -> None:
    axes = axes_of()
    draw_prior_curves(axes, FOUND, KASS_RAFTERY)
    heights = [float(np.asarray(line.get_ydata())[0]) for line in axes.lines if line.get_gid() == "bound"]
    assert heights == [bound.ln_bayes_factor for bound in FOUND.bounds]


@pytest.mark.parametrize("scale", [KASS_RAFTERY, JEFFREYS], ids=lambda scale: scale.name)
@pytest.mark.parametrize("found", [FOUND, hand.examination(4.0)], ids=["excess", "deficit"])
def test_a_stretch_has_the_grade_of_every_mean_inside_it(found: PriorSensitivity, scale: Scale) -> None:
    boundaries = both_sides(scale)
    for family in found.families:
        parts = stretches(found, family, scale, boundaries)
        assert [ends[1] for ends, _ in parts[:-1]] == [ends[0] for ends, _ in parts[1:]]
        for mean, one in zip(found.means, family.averages, strict=True):
            value = -np.inf if one.ln_bayes_factor is None else one.ln_bayes_factor
            inside = [step for (low, high), step in parts if low <= mean <= high]
            assert grade(value, boundaries) in inside
            assert len(inside) <= 2  # on an end


def test_the_map_has_a_row_a_family_and_marks_the_declared_one() -> None:
    axes = axes_of()
    draw_prior_map(axes, FOUND, KASS_RAFTERY)
    labels = [label.get_text() for label in axes.get_yticklabels()]
    assert labels[:3] == ["largest, any prior", "largest, peak at 1", "largest, never rising"]
    assert labels[3:] == [family.name for family in FOUND.families]
    (ring,) = [line for line in axes.lines if line.get_gid() == "declared"]
    row = axes.get_yticks()[labels.index("uniform")]
    assert np.asarray(ring.get_ydata()).tolist() == [row]


def test_a_prior_of_no_family_has_no_ring() -> None:
    axes = axes_of()
    given = replace(FOUND, declared=replace(FOUND.declared, family="beta", text="beta 2, 3 from 0 to 1"))
    draw_prior_map(axes, given, KASS_RAFTERY)
    assert not of_kind(axes, "declared")
    assert of_kind(axes, "declared mean")


@pytest.mark.parametrize("palette", [LIGHT, DARK], ids=["light", "dark"])
def test_steps_are_one_hue_told_apart_by_lightness(palette: Palette) -> None:
    values = [lightness(colour) for colour in palette.steps(7)]
    steps = [second - first for first, second in pairwise(values)]
    assert all(step < -4.0 for step in steps) or all(step > 4.0 for step in steps)


def test_power_scaling_marks_stand_at_their_numbers() -> None:
    axes = axes_of()
    draw_sensitivities(axes, FOUND.scalings)
    assert axes.get_yticklabels()[0].get_text() == "continuum scale"
    assert of_kind(axes, "threshold") == [[0.05, 0.05]]
    other = axes_of()
    draw_power_changes(other, FOUND.scalings)
    words = [text.get_text() for text in other.texts if text.get_gid() == "rests on"]
    assert words == [one.driver.value for one in FOUND.scalings]


def test_of_many_nuisance_priors_those_that_move_ln_b_most_are_shown_in_their_order() -> None:
    kept = most_moving(FOUND.scalings, 2)
    assert [one.parameter for one in kept] == ["continuum normalisation", "fake composition"]


def render(page: Figure) -> None:
    """Lay out a page's words as they are drawn."""
    FigureCanvasAgg(page).draw()  # type: ignore[no-untyped-call]


def words_of(page: Figure) -> list[Text]:
    """Return a page's words, the numbers along its axes left out."""
    found = [text for part in page.subfigs for text in part.texts]
    for axes in page.findobj(Axes):
        assert isinstance(axes, Axes)
        rows = axes.get_yticklabels()
        names = [text for text in rows if any(letter.isalpha() for letter in text.get_text())]
        found += [*axes.texts, axes.xaxis.label, axes.yaxis.label, *names]
    return [text for text in found if text.get_text().strip()]


@pytest.mark.parametrize("palette", [LIGHT, DARK], ids=["light", "dark"])
@pytest.mark.parametrize(
    "found",
    [FOUND, hand.examination(4.0), hand.examination(300.0, 80.0, 60.0), hand.unestablished()],
    ids=["excess", "deficit", "huge", "not established"],
)
def test_no_words_on_the_page_are_cut_off(found: PriorSensitivity, palette: Palette) -> None:
    page = priors_page(hand.examined(found), palette)
    render(page)
    assert to_hex(page.get_facecolor()) == palette.paper
    for text in words_of(page):
        box = text.get_window_extent()
        inside = page.bbox.x0 - 1 <= box.x0 and box.x1 <= page.bbox.x1 + 1
        assert inside, text.get_text()


@pytest.mark.parametrize("found", [FOUND, hand.examination(4.0)], ids=["excess", "deficit"])
def test_names_of_curves_and_bounds_do_not_lie_on_each_other(found: PriorSensitivity) -> None:
    page = priors_page(hand.examined(found))
    render(page)
    for gid in ("family words", "bound words", "rests on"):
        for axes in page.findobj(Axes):
            boxes = [text.get_window_extent() for text in axes.texts if text.get_gid() == gid]
            for place, first in enumerate(boxes):
                assert not any(first.overlaps(other) for other in boxes[place + 1 :]), gid


def test_when_neither_fits_the_page_says_so_and_drawing_changes_no_settings() -> None:
    before = dict(mpl.rcParams)
    page = priors_page(hand.examined(fails=True))
    texts = [text.get_text() for text in page.findobj(Text) if isinstance(text, Text)]
    assert "NEITHER HYPOTHESIS DESCRIBES THE DATA" in texts
    assert dict(mpl.rcParams) == before
