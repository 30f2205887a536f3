"""A small app made of the bench's parts, which the browser test drives; its picture shows made-up counts."""

from __future__ import annotations

import time
from functools import partial
from typing import TYPE_CHECKING

import ipywidgets
import numpy as np
import numpy.typing as npt
import traitlets

from tests.widgets.jobs.slow_blocks import busy
from workbench.plots.drawing import Drawing, Look, Picture, Rows, Sketch
from workbench.plots.frame import clean_axes
from workbench.plots.palette import Palette
from workbench.widgets.binding import bind
from workbench.widgets.canvas import Canvas
from workbench.widgets.document import Document, Summary
from workbench.widgets.home import Home
from workbench.widgets.jobs.blocks import Blocks
from workbench.widgets.jobs.newest import Newest
from workbench.widgets.jobs.work import Stage, Work
from workbench.widgets.notices import Notices
from workbench.widgets.number import Number
from workbench.widgets.page import Page
from workbench.widgets.plain import Plain
from workbench.widgets.work_line import WorkLine

if TYPE_CHECKING:
    from matplotlib.figure import Figure

Array = npt.NDArray[np.float64]
EDGES = np.linspace(20.0, 80.0, 31)
CENTRES = 0.5 * (EDGES[1:] + EDGES[:-1])
BACKGROUND = 90.0 * np.exp(-(CENTRES - 20.0) / 18.0)
SIGNAL = 12.0 * np.exp(-0.5 * ((CENTRES - 45.0) / 3.0) ** 2)


class State(traitlets.HasTraits):
    """What the app is asked; no widget is known here."""

    strength = traitlets.Float(1.0)
    mood = traitlets.Unicode("calm")


def expected(strength: float) -> Array:
    """Return expected events in every bin."""
    return np.asarray(BACKGROUND + strength * SIGNAL, dtype=np.float64)


def total(counts: Array) -> str:
    """Return the sum as the test reads it."""
    return f"{counts.sum():.1f} events in all"


def draw(figure: Figure, counts: Array, palette: Palette) -> None:
    """Draw the expected events over the background."""
    axes = figure.add_axes((0.09, 0.16, 0.88, 0.76))
    clean_axes(axes, palette)
    axes.stairs(BACKGROUND, EDGES, color=palette.background.line, linewidth=palette.background.width)
    axes.stairs(counts, EDGES, color=palette.signal.line, linewidth=palette.signal.width, gid="expected")
    axes.set_xlim(20.0, 80.0)
    axes.set_ylim(0.0, 130.0)
    axes.set_xlabel("mass [GeV]", color=palette.ink)


def update(figure: Figure, counts: Array) -> bool:
    """Move the one mark that changes."""
    (mark,) = (patch for patch in figure.axes[0].patches if patch.get_gid() == "expected")
    mark.set_data(counts)  # type: ignore[attr-defined]  # a StepPatch
    return bool(counts.max() < 130.0)


def rows(figure: Figure, counts: Array) -> Rows:
    """Return one line a bin."""
    texts = [
        f"{low:.0f} to {high:.0f} GeV: {count:.2f} events"
        for low, high, count in zip(EDGES[:-1], EDGES[1:], counts, strict=True)
    ]
    return Rows(figure.axes[0], tuple(map(float, EDGES)), tuple(texts))


SKETCH = Sketch((8.0, 4.5), draw, total, rows, update)


class TinyApp:
    """One slider, one picture, one long run, one fault."""

    def __init__(self) -> None:
        self.home, self.state, self.page = Home(Notices()), State(), Page()
        self.drawing, self.paper = Drawing(SKETCH), Drawing(SKETCH)
        self.newest = Newest(Work(), self.home, self._picture)
        self.blocks = Blocks(Work(), self.home, number=1)
        self.canvas = Canvas()
        self.document = Document("Expected counts", self._arranged(), self.home, self.page)
        self.newest.work.observe(self.home.wrap(self._show), "standing")
        self.state.observe(self.home.wrap(self._ask), "strength")
        self.page.observe(self.home.wrap(self._ask), "look")
        self._ask()

    def _arranged(self) -> ipywidgets.Widget:
        strength = Number(label="Signal strength", low=0.0, high=5.0, step=0.05)
        mood = Plain(ipywidgets.ToggleButtons(options=["calm", "busy"], description="Mood"))
        bind(self.home, self.state, "strength", strength)
        bind(self.home, self.state, "mood", mood)
        buttons = [
            self._button("Long run", self._start),
            self._button("Break", lambda: 1 / 0),
            self._button("Talk", lambda: print("said aside")),
        ]
        line = WorkLine(self.home, self.blocks.work, self.blocks.cancel)
        return ipywidgets.VBox([strength, mood.view, ipywidgets.HBox(buttons), line.view, self.canvas])

    def _button(self, name: str, does: object) -> ipywidgets.Button:
        button = ipywidgets.Button(description=name)
        button.on_click(self.home.wrap(lambda _: does()))  # type: ignore[operator]
        return button

    def _picture(self, strength: float, mood: str, look: Look) -> Picture:
        if mood == "busy":
            time.sleep(1.0)
        return self.drawing.picture(expected(strength), look)

    def _ask(self, _: object = None) -> None:
        strength, mood = self.state.strength, self.state.mood
        self.newest.request(f"strength {strength:g}", strength, mood, self.page.look)

    def _show(self, _: object) -> None:
        standing = self.newest.work.standing
        self.canvas.show(standing)
        if standing.stage is Stage.DONE:
            self.document.keep(partial(self._summary, self.state.strength))

    def _summary(self, strength: float) -> Summary:
        picture = self.paper.picture(expected(strength), Look())
        return Summary(
            (("strength", f"{strength:g}"), ("in all", picture.alt)), ((picture.alt, picture.png),)
        )

    def _start(self) -> None:
        self.blocks.start("a long run", busy, [(0.2,), (600.0,)], len)


def tiny_app() -> Document:
    """Return what a cell displays."""
    return TinyApp().document
