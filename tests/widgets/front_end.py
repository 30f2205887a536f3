"""Stands for the browser: keeps what reached it, and sends what a page would send."""

from __future__ import annotations

from typing import Any

import comm
import comm.base_comm
import ipywidgets
import pytest


class FrontEnd:
    """Every message of every widget, and the state that a page would hold."""

    def __init__(self) -> None:
        self.messages: list[tuple[str, str, dict[str, Any]]] = []

    def updates(self, widget: ipywidgets.Widget) -> list[dict[str, Any]]:
        """Return the states that were sent for a widget, oldest first."""
        return [
            data["state"] for name, _, data in self.messages if name == widget.model_id and "state" in data
        ]

    def state(self, widget: ipywidgets.Widget) -> dict[str, Any]:
        """Return what a page knows of a widget."""
        return {name: value for update in self.updates(widget) for name, value in update.items()}

    def change(self, widget: ipywidgets.Widget, **state: Any) -> None:
        """Change a widget's state as the page does."""
        self._send(widget, {"method": "update", "state": state, "buffer_paths": []})

    def send(self, widget: ipywidgets.Widget, **content: Any) -> None:
        """Send a message as a script in the page does."""
        self._send(widget, {"method": "custom", "content": content})

    def click(self, button: ipywidgets.Button) -> None:
        """Click a button, unless it is disabled: the page would not send that."""
        assert not button.disabled
        self.send(button, event="click")

    @staticmethod
    def _send(widget: ipywidgets.Widget, data: dict[str, Any]) -> None:
        content = {"comm_id": widget.model_id, "data": data}
        widget.comm.handle_msg({"content": content, "buffers": [], "metadata": {}})


def front_end(monkeypatch: pytest.MonkeyPatch) -> FrontEnd:
    """Return a front end that every widget made from now on talks to."""
    made = FrontEnd()

    class Comm(comm.base_comm.BaseComm):
        def publish_msg(
            self,
            msg_type: str,
            data: Any = None,
            metadata: Any = None,
            buffers: Any = None,
            **keys: Any,
        ) -> None:
            made.messages.append((self.comm_id, msg_type, data or {}))

    monkeypatch.setattr(comm, "create_comm", Comm)
    return made
