"""A picture drawn again and again on a figure that is kept, for a page that shows it at once."""

from __future__ import annotations

import io
import threading
from collections.abc import Callable
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, NamedTuple

from workbench.plots.palette import Palette, palette_of

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

PIXELS_AN_INCH = 100.0  # of the page; a finer screen gets more


@dataclass(frozen=True, slots=True)
class Rows:
    """The numbers of a picture along its x axis, read out where the pointer is.

    Attributes:
        axes: below which they lie.
        edges: where each row begins, and where the last one ends; ascending, in units of the x axis.
        texts: one line a row.
    """

    axes: Axes
    edges: tuple[float, ...]
    texts: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Readout:
    """`Rows` in pixels of the page, so that it needs nothing else to find one.

    Attributes:
        edges: as in `Rows`.
        rows: the lines.
        frame: left, right, top and bottom of the axes [px].
        limits: of the x axis.
        is_logarithmic: whether the x axis is.
    """

    edges: tuple[float, ...]
    rows: tuple[str, ...]
    frame: tuple[float, float, float, float]
    limits: tuple[float, float]
    is_logarithmic: bool

    def in_page(self) -> dict[str, Any]:
        """Return it as the page takes it."""
        left, right, top, bottom = self.frame
        return {
            "edges": [*self.edges],
            "rows": [*self.rows],
            "left": left,
            "right": right,
            "top": top,
            "bottom": bottom,
            "low": self.limits[0],
            "high": self.limits[1],
            "is_logarithmic": self.is_logarithmic,
        }


@dataclass(frozen=True, slots=True)
class Picture:
    """A picture as the page takes it.

    Attributes:
        png: its bytes.
        size: width and height on the page [px].
        alt: what it shows, with the numbers.
        readout: the numbers under the pointer, if any.
        is_dark: drawn for the dark theme.
    """

    png: bytes
    size: tuple[int, int]
    alt: str
    readout: Readout | None
    is_dark: bool


class Look(NamedTuple):
    """How the page looks that a picture is drawn for.

    Attributes:
        is_dark: it has the dark theme.
        pixel_ratio: pixels of the screen for one of the page; 1 to 3.
    """

    is_dark: bool = False
    pixel_ratio: float = 1.0


@dataclass(frozen=True, slots=True)
class Sketch:
    """How to draw one kind of result.

    Attributes:
        size: width and height [inches], a hundred pixels of the page each.
        draw: draws a result on an empty figure.
        describe: says what it shows, with the numbers.
        rows: the numbers along its x axis, from the drawn figure and the result; None for none.
        update: changes the marks that were drawn for another result; False if they can't be, and it must be
            drawn afresh. None to draw afresh always.
    """

    size: tuple[float, float]
    draw: Callable[[Figure, Any, Palette], object]
    describe: Callable[[Any], str]
    rows: Callable[[Figure, Any], Rows] | None = None
    update: Callable[[Figure, Any], bool] | None = None


class Drawing:
    """Makes pictures of results, on one figure as long as the look stays; one at a time, on any thread.

    Args:
        sketch: how to draw.
    """

    def __init__(self, sketch: Sketch) -> None:
        self._sketch = sketch
        self._lock = threading.Lock()
        self._figure: Figure | None = None
        self._look: Look | None = None

    def picture(self, result: Any, look: Look) -> Picture:
        """Return the picture of a result.

        Args:
            result: what the sketch draws.
            look: of the page.
        """
        sketch = self._sketch
        with self._lock:
            figure = self._drawn(result, look)
            png = _png(figure)
            readout = _readout(sketch.rows(figure, result), look.pixel_ratio) if sketch.rows else None
        width, height = (round(PIXELS_AN_INCH * inches) for inches in sketch.size)
        return Picture(png, (width, height), sketch.describe(result), readout, look.is_dark)

    def _drawn(self, result: Any, look: Look) -> Figure:
        from matplotlib.backends.backend_agg import FigureCanvasAgg
        from matplotlib.figure import Figure

        figure = self._figure
        if figure is not None and self._look == look and self._updated(figure, result):
            return figure
        palette = palette_of(is_dark=look.is_dark)
        self._figure = None  # none is kept that was drawn in part
        figure = Figure(self._sketch.size, dpi=PIXELS_AN_INCH * look.pixel_ratio, facecolor=palette.paper)
        FigureCanvasAgg(figure)
        self._sketch.draw(figure, result, palette)
        self._figure, self._look = figure, look
        return figure

    def _updated(self, figure: Figure, result: Any) -> bool:
        return self._sketch.update is not None and self._sketch.update(figure, result)


def _png(figure: Figure) -> bytes:
    content = io.BytesIO()
    figure.canvas.print_png(content, pil_kwargs={"compress_level": 1})  # type: ignore[attr-defined]  # of Agg
    return content.getvalue()


def _readout(rows: Rows, pixel_ratio: float) -> Readout:
    window, figure = rows.axes.get_window_extent(), rows.axes.get_figure(root=True)
    height = figure.bbox.height if figure else 0.0
    sides = (window.x0, window.x1, height - window.y1, height - window.y0)
    left, right, top, bottom = (float(side) / pixel_ratio for side in sides)
    low, high = (float(limit) for limit in rows.axes.get_xlim())
    is_logarithmic = rows.axes.get_xscale() == "log"
    return Readout(rows.edges, rows.texts, (left, right, top, bottom), (low, high), is_logarithmic)
