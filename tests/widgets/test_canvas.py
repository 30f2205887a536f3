"""Pictures reach the page in one message, stay while the next is made, and follow the theme."""

from __future__ import annotations

import io
from typing import TYPE_CHECKING

import numpy as np
import pytest
from PIL import Image

from tests.widgets.front_end import FrontEnd
from workbench.plots.drawing import Drawing, Look, Rows, Sketch
from workbench.plots.palette import DARK, LIGHT, Palette, palette_of
from workbench.widgets.canvas import Canvas
from workbench.widgets.jobs.work import Work
from workbench.widgets.page import Page

if TYPE_CHECKING:
    from matplotlib.figure import Figure

EDGES = np.array([1.0, 2.0, 4.0, 8.0])
Counts = tuple[float, ...]


class Stairs:
    """Draws three bins, and remembers how often it drew afresh."""

    def __init__(self, scale: str = "linear") -> None:
        self.drawn, self.scale = 0, scale

    def draw(self, figure: Figure, counts: Counts, palette: Palette) -> None:
        self.drawn += 1
        axes = figure.add_axes((0.1, 0.2, 0.8, 0.6), facecolor=palette.paper)
        axes.stairs(counts, EDGES, color=palette.signal.line, linewidth=3.0, gid="counts")
        axes.set_xscale(self.scale)
        axes.set(xlim=(1.0, 8.0), ylim=(0.0, 10.0))

    def update(self, figure: Figure, counts: Counts) -> bool:
        (stairs,) = (mark for mark in figure.axes[0].patches if mark.get_gid() == "counts")
        stairs.set_data(counts)  # type: ignore[attr-defined]
        return max(counts) <= 10.0

    def rows(self, figure: Figure, counts: Counts) -> Rows:
        return Rows(figure.axes[0], tuple(EDGES), tuple(f"{count:.0f} events" for count in counts))

    def sketch(self, *, in_place: bool) -> Sketch:
        return Sketch(
            (6.0, 4.0),
            self.draw,
            lambda counts: f"{counts} events",
            self.rows,
            self.update if in_place else None,
        )


def pixels(png: bytes) -> np.ndarray[tuple[int, ...], np.dtype[np.uint8]]:
    return np.asarray(Image.open(io.BytesIO(png)).convert("RGB"))


def rgb(colour: str) -> tuple[int, ...]:
    return tuple(int(colour[place : place + 2], 16) for place in (1, 3, 5))


def test_a_figure_updated_in_place_is_the_one_drawn_afresh() -> None:
    kept, fresh = Stairs(), Stairs()
    drawing = Drawing(kept.sketch(in_place=True))
    drawing.picture((1.0, 2.0, 3.0), Look())
    moved = drawing.picture((3.0, 5.0, 9.0), Look())
    anew = Drawing(fresh.sketch(in_place=False)).picture((3.0, 5.0, 9.0), Look())
    assert kept.drawn == 1
    assert np.array_equal(pixels(moved.png), pixels(anew.png))


def test_what_cannot_be_updated_or_looks_different_is_drawn_afresh() -> None:
    stairs = Stairs()
    drawing = Drawing(stairs.sketch(in_place=True))
    for counts, look in [
        ((1.0, 2.0, 3.0), Look()),
        ((1.0, 2.0, 30.0), Look()),
        ((1.0, 2.0, 3.0), Look(is_dark=True)),
        ((1.0, 2.0, 3.0), Look(is_dark=True, pixel_ratio=2.0)),
    ]:
        drawing.picture(counts, look)
    assert stairs.drawn == 4


@pytest.mark.parametrize("is_dark", [False, True])
def test_a_picture_has_the_paper_and_the_colours_of_its_theme(is_dark: bool) -> None:
    picture = Drawing(Stairs().sketch(in_place=True)).picture((4.0, 6.0, 8.0), Look(is_dark=is_dark))
    assert palette_of(is_dark=is_dark) is (DARK if is_dark else LIGHT)
    shown = pixels(picture.png)
    assert tuple(shown[0, 0]) == rgb(palette_of(is_dark=is_dark).paper)
    assert (shown == rgb(palette_of(is_dark=is_dark).signal.line)).all(axis=-1).sum() > 100
    assert picture.is_dark is is_dark


@pytest.mark.parametrize("ratio", [1.0, 2.0])
def test_a_finer_screen_gets_more_pixels_on_the_same_room(ratio: float) -> None:
    picture = Drawing(Stairs().sketch(in_place=True)).picture((4.0, 6.0, 8.0), Look(pixel_ratio=ratio))
    assert picture.size == (600, 400)
    assert pixels(picture.png).shape == (400 * ratio, 600 * ratio, 3)


@pytest.mark.parametrize("ratio", [1.0, 2.0])
def test_the_readout_lies_where_the_axes_are_on_the_page(ratio: float) -> None:
    """By hand: axes from 10 to 90 % of 600 px across, and from 20 to 80 % of 400 px down."""
    picture = Drawing(Stairs("log").sketch(in_place=True)).picture((4.0, 6.0, 8.0), Look(pixel_ratio=ratio))
    assert picture.readout is not None
    assert picture.readout.frame == pytest.approx((60.0, 540.0, 80.0, 320.0))
    assert (picture.readout.limits, picture.readout.is_logarithmic) == ((1.0, 8.0), True)
    assert picture.readout.rows == ("4 events", "6 events", "8 events")


def test_a_picture_and_its_words_reach_the_page_in_one_message(front: FrontEnd) -> None:
    canvas, work = Canvas(), Work()
    picture = Drawing(Stairs().sketch(in_place=True)).picture((4.0, 6.0, 8.0), Look())
    work.finish(work.ask("counts"), "counts", picture)
    before = len(front.updates(canvas))
    canvas.show(work.standing)
    (update,) = front.updates(canvas)[before:]
    assert {"sequence", "alt", "readout"} <= set(update)  # and the bytes of the picture, sent beside them
    assert update["alt"] == "(4.0, 6.0, 8.0) events"


def test_a_stale_picture_stays_named_and_is_not_sent_again(front: FrontEnd) -> None:
    canvas, work = Canvas(), Work()
    picture = Drawing(Stairs().sketch(in_place=True)).picture((4.0, 6.0, 8.0), Look())
    work.finish(work.ask("strength 1"), "strength 1", picture)
    canvas.show(work.standing)
    work.ask("strength 2")
    before = len(front.updates(canvas))
    canvas.show(work.standing)
    assert front.updates(canvas)[before:] == [{"is_stale": True, "caption": "Still shown: strength 1"}]


def test_the_page_tells_how_it_looks(front: FrontEnd) -> None:
    page, told = Page(), list[Look]()
    page.observe(lambda change: told.append(change["new"]), "look")
    front.change(page, is_dark=True, pixel_ratio=2.0)
    assert page.look == Look(is_dark=True, pixel_ratio=2.0)
    assert told[-1] == page.look
