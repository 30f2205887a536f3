"""What the page itself must see to: keys that stay inside, names for screen readers, the theme."""

from __future__ import annotations

from typing import Any

import anywidget
import traitlets

from workbench.plots.drawing import Look
from workbench.widgets.scripts import script


class Page(anywidget.AnyWidget):
    """An invisible widget that looks after those in the same output.

    No key pressed inside reaches the notebook, whose `d d` would delete the cell; sliders, progress bars and
    choices of ipywidgets get names and roles; the kernel is told how the page looks.

    Attributes:
        is_dark: written by the page: it has a dark theme.
        pixel_ratio: written by the page: pixels of the screen for one of its own.
        look: both, for drawings.
        renderings: written by the page: how often it was shown; more than once after it was loaded again.
    """

    _esm = script("page.js")

    is_dark = traitlets.Bool(default_value=False).tag(sync=True)
    pixel_ratio = traitlets.Float(1.0).tag(sync=True)
    renderings = traitlets.Int(0).tag(sync=True)
    look = traitlets.Instance(Look, ())

    def rewrite(self, key: str, bundle: dict[str, str]) -> None:
        """Have the page put a bundle in place of the output that has a key, where display ids are forgotten.

        Args:
            key: what the output's HTML holds, followed by "-saved".
            bundle: texts by media type.
        """
        if self.renderings > 1:
            self.send({"key": key, "bundle": bundle})

    @traitlets.observe("is_dark", "pixel_ratio")
    def _note_look(self, _: dict[str, Any]) -> None:
        self.look = Look(self.is_dark, self.pixel_ratio)
