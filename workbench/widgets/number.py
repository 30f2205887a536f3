"""A number with a slider beside it, which asks for values and shows the one that was decided."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import anywidget
import traitlets

from workbench.errors import Problem, quoted
from workbench.widgets.scripts import script


class Number(anywidget.AnyWidget):
    """A labelled number box, with a slider whose range never limits the value.

    Attributes:
        label: what it is, beside it and for screen readers.
        unit: of the value.
        help: what it does, in a sentence.
        value: the value shown; the page never changes it, it asks.
        low: where the slider begins.
        high: where it ends.
        step: between two of its positions, unless it is logarithmic.
        is_logarithmic: equal steps are equal factors; `low` above 0.
        has_slider: show the slider.
        is_disabled: take no requests.
        problem: why the last request was refused, shown below.
        answered: number of the last request that was dealt with.
    """

    _esm = script("number.js")
    _css = script("number.css")

    label = traitlets.Unicode().tag(sync=True)
    unit = traitlets.Unicode().tag(sync=True)
    help = traitlets.Unicode().tag(sync=True)
    value = traitlets.Float(0.0).tag(sync=True)
    low = traitlets.Float(0.0).tag(sync=True)
    high = traitlets.Float(1.0).tag(sync=True)
    step = traitlets.Float(0.01).tag(sync=True)
    is_logarithmic = traitlets.Bool(default_value=False).tag(sync=True)
    has_slider = traitlets.Bool(default_value=True).tag(sync=True)
    is_disabled = traitlets.Bool(default_value=False).tag(sync=True)
    problem = traitlets.Unicode().tag(sync=True)
    answered = traitlets.Int(0).tag(sync=True)

    def show(self, value: float) -> None:
        """Show the value that was decided."""
        self.value = value

    def complain(self, text: str) -> None:
        """Show below why a request was refused; nothing if it was not."""
        self.problem = text

    def on_asked(
        self, callback: Callable[[Any], object], at_home: Callable[..., Callable[..., None]]
    ) -> None:
        """Call back when a value is asked for.

        Args:
            callback: gets the value.
            at_home: makes a callback run on the home thread.
        """

        def asked(_: object, content: dict[str, Any], __: object) -> None:
            with self.hold_sync():  # the value, the problem and the number go in one message
                try:
                    self._deal_with(content.get("asked"), callback)
                finally:
                    self.answered = int(content.get("number", 0))

        self.on_msg(at_home(asked))

    def _deal_with(self, asked: object, callback: Callable[[Any], object]) -> None:
        if isinstance(asked, int | float):
            callback(float(asked))
        else:
            self.complain(
                Problem(
                    "Not a number",
                    self.label,
                    quoted(str(asked)),
                    "a number, like 0.5 or 1e-3",
                    "type it again",
                ).text()
            )
