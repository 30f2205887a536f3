"""The picture of an updating ratio, read from its marks: peak, steps of one hue, nothing cut off."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from itertools import combinations, pairwise

import numpy as np
import pytest
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.colors import to_rgb
from matplotlib.contour import ContourSet
from matplotlib.figure import Figure

from tests.records import hand_scans as scans
from workbench.evidence.ratio.reading import profile, sheet, shown_values
from workbench.evidence.ratio.results import Scan
from workbench.hypotheses.priors import Gamma
from workbench.plots.palette import DARK, LIGHT
from workbench.plots.scan_page import scan_page

LONG = "a resonance of a kind that nobody has ever thought of, with a very long name"


def drawn(found: Scan, palette: object = LIGHT) -> Figure:
    read = sheet(found) if len(found.over) == 2 else profile(found, shown_values(found, 201))
    page = scan_page(found, read, palette)  # type: ignore[arg-type]
    FigureCanvasAgg(page).draw()  # type: ignore[no-untyped-call]
    return page


def axes_of(found: Scan) -> Axes:
    (axes,) = drawn(found).axes
    return axes


def marks(axes: Axes, gid: str) -> list[tuple[float, float]]:
    lines = [line for line in axes.lines if line.get_gid() == gid]
    return [(float(np.asarray(x.get_xdata())[0]), float(np.asarray(x.get_ydata())[0])) for x in lines]


def test_the_peak_of_a_curve_stands_at_its_place_with_its_number() -> None:
    axes = axes_of(scans.over_mass())
    ((x, y),) = marks(axes, "peak")
    assert x == pytest.approx(46.3, abs=0.1)
    assert y == pytest.approx(3.5 / np.log(10.0), abs=0.01)
    words = " ".join(text.get_text() for text in axes.texts)
    assert "R = 33.11 ± 0.20" in words
    assert marks(axes, "even")[0][1] == 0.0


def test_the_curve_is_the_one_given() -> None:
    axes = axes_of(scans.over_strength())
    (curve,) = [line for line in axes.lines if line.get_gid() == "curve"]
    x, y = (np.asarray(part, dtype=float) for part in (curve.get_xdata(), curve.get_ydata()))
    exact = scans.ln_ratio(x, np.array(46.3)) / np.log(10.0)
    seen = exact > -6.0
    np.testing.assert_allclose(y[seen], exact[seen], atol=0.01)


def test_what_r_was_averaged_over_is_written_above() -> None:
    assert "averaged over strength uniform from 0 to 5" in axes_of(scans.over_mass()).get_title(loc="left")
    assert "averaged" not in axes_of(scans.scan()).get_title(loc="left")


def test_what_is_not_established_says_so() -> None:
    assert "NOT ESTABLISHED" in axes_of(scans.unestablished()).get_title(loc="left")


def test_the_peak_of_a_surface_stands_at_its_place() -> None:
    ((x, y),) = marks(axes_of(scans.scan()), "peak")
    assert x == pytest.approx(46.3, abs=0.1)
    assert y == pytest.approx(1.5, abs=0.03)


@pytest.mark.parametrize("made", [scans.scan, lambda: with_peak(0.4), lambda: with_peak(300.0)])
def test_steps_are_one_hue_that_only_gets_darker(made: Callable[[], Scan]) -> None:
    axes = axes_of(made())
    keys = [one for one in axes.collections if one.get_gid() == "key"]
    colours = [tuple(np.asarray(one.get_facecolor())[0, :3]) for one in keys]
    lightness = [sum(colour) for colour in colours]
    assert all(after < before for before, after in pairwise(lightness))
    paper, hue = np.array(to_rgb(LIGHT.paper)), np.array(to_rgb(LIGHT.signal.line))
    for colour in colours:
        share = (paper - colour) / (paper - hue)
        np.testing.assert_allclose(share, share.mean(), atol=0.02)
    (steps,) = [one for one in axes.collections if one.get_gid() == "steps"]
    assert isinstance(steps, ContourSet)
    assert np.max(np.asarray(steps.levels)) > sheet(made()).ln_ratio.max() / np.log(10.0), (
        "the peak is no hole"
    )
    words = [text.get_text() for text in axes.texts if text.get_gid() == "key words"]
    assert "1" in words
    assert len(set(words)) == len(words)


def with_peak(factor: float) -> Scan:
    """Return the scan with ln R so many times as large."""
    given = scans.scan()
    assert given.surface is not None
    return replace(given, surface=replace(given.surface, ln_ratio=factor * given.surface.ln_ratio))


def long_names() -> Scan:
    return replace(scans.over_mass(), hypothesis=LONG, against=LONG, averaged={LONG: Gamma(2.3456, 0.98765)})


@pytest.mark.parametrize(
    "made",
    [
        scans.scan,
        scans.over_mass,
        scans.over_strength,
        long_names,
        lambda: with_peak(300.0),
        lambda: with_peak(0.02),
    ],
)
def test_nothing_is_cut_off_and_no_words_stand_on_words(made: Callable[[], Scan]) -> None:
    page = drawn(made())
    (axes,) = page.axes
    frame = page.bbox
    title = axes._left_title  # type: ignore[attr-defined]
    texts = [*axes.texts, title, axes.xaxis.label, axes.yaxis.label]
    boxes = [text.get_window_extent() for text in texts if text.get_text().strip()]
    for box in boxes:
        assert frame.x0 - 1 <= box.x0
        assert box.x1 <= frame.x1 + 1
        assert frame.y0 - 1 <= box.y0
        assert box.y1 <= frame.y1 + 1
    for one, other in combinations(boxes, 2):
        assert not one.overlaps(other)


def test_both_themes_are_drawn() -> None:
    for made in (scans.scan, scans.over_mass):
        assert drawn(made(), DARK).get_facecolor() != drawn(made(), LIGHT).get_facecolor()
