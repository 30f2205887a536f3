"""A canvas in the page that shows the newest picture without flicker."""

from __future__ import annotations

import anywidget
import traitlets

from workbench.plots.drawing import Picture
from workbench.widgets.jobs.work import Standing
from workbench.widgets.scripts import script


class Canvas(anywidget.AnyWidget):
    """Shows pictures: each is painted only once it is decoded, in the page's theme, sharp on fine screens.

    Attributes:
        png: the newest picture.
        size: its width and height on the page [px].
        alt: what it shows, with the numbers, for screen readers.
        readout: the numbers under the pointer and the arrow keys, see `Readout`; empty for none.
        is_dark: drawn for the dark theme.
        is_stale: not of what was asked last.
        caption: what a stale picture is of.
        sequence: counts the pictures; the page answers with the one that it has painted.
    """

    _esm = script("canvas.js")
    _css = script("canvas.css")

    png = traitlets.Bytes(b"").tag(sync=True)
    size = traitlets.List([600, 400]).tag(sync=True)
    alt = traitlets.Unicode("No picture yet").tag(sync=True)
    readout = traitlets.Dict().tag(sync=True)
    is_dark = traitlets.Bool(default_value=False).tag(sync=True)
    is_stale = traitlets.Bool(default_value=False).tag(sync=True)
    caption = traitlets.Unicode().tag(sync=True)
    sequence = traitlets.Int(0).tag(sync=True)

    def show(self, standing: Standing) -> None:
        """Show how a piece of work stands whose results are pictures.

        Args:
            standing: with a `Picture` as its result, or None.
        """
        with self.hold_sync():  # the picture and its words go in one message
            self.is_stale, self.caption = standing.is_stale, standing.caption
            if standing.result is not None and standing.result.png is not self.png:
                self._take(standing.result)

    def _take(self, picture: Picture) -> None:
        self.png, self.size, self.alt = picture.png, [*picture.size], picture.alt
        self.readout = picture.readout.in_page() if picture.readout else {}
        self.is_dark = picture.is_dark
        self.sequence += 1
