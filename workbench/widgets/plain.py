"""Controls of ipywidgets without a range, made to ask and to show what was decided."""

from __future__ import annotations

import html
import threading
from collections.abc import Callable, Iterable, Iterator
from contextlib import contextmanager
from typing import Any

import ipywidgets
import traitlets


class Plain:
    """A text, a check box or a choice, with a line below for what was refused.

    Args:
        control: of ipywidgets, with a `value` and a `description`.

    Attributes:
        control: the same.
        view: what to place: the control and the line.

    Raises:
        TypeError: for a control with a range, which would change its value by itself; `Number` has none.
    """

    def __init__(self, control: ipywidgets.ValueWidget) -> None:
        if control.has_trait("max"):
            raise TypeError(f"{type(control).__name__} changes its value with its range; use Number")
        self.control = control
        self._line = ipywidgets.HTML()
        self.view = ipywidgets.VBox([control, self._line])
        self._shower: int | None = None  # the thread that shows a value, which nobody asked for

    def show(self, value: Any) -> None:
        """Show the value that was decided; a choice that is not offered is shown as none."""
        with self._showing():
            try:
                self.control.value = value
            except traitlets.TraitError:
                self.control.index = None

    def offer(self, options: Iterable[Any], value: Any) -> None:
        """Offer other choices; ipywidgets itself would pick the first, and that would ask for it.

        Args:
            options: as ipywidgets takes them.
            value: what the state holds.
        """
        with self._showing():
            self.control.options = tuple(options)
        self.show(value)

    def complain(self, text: str) -> None:
        """Show why a request was refused; nothing if it was not."""
        style = "white-space: pre-wrap; font-family: monospace; padding-left: 10px; border-left: 4px solid"
        self._line.value = f'<div role="alert" style="{style}">{html.escape(text)}</div>' if text else ""

    def on_asked(
        self,
        callback: Callable[[Any], object],
        at_home: Callable[[Callable[..., object]], Callable[..., None]],
    ) -> None:
        """Call back when the user changed the control.

        Args:
            callback: gets the value.
            at_home: makes a callback run on the home thread.
        """
        ask = at_home(callback)

        def changed(change: dict[str, Any]) -> None:
            if self._shower != threading.get_ident():
                ask(change["new"])

        self.control.observe(changed, "value")

    @contextmanager
    def _showing(self) -> Iterator[None]:
        outer, self._shower = self._shower, threading.get_ident()
        try:
            yield
        finally:
            self._shower = outer
