"""The line that shows notices: what callbacks raised or printed, which JupyterLab shows to nobody."""

from __future__ import annotations

import html

import ipywidgets

from workbench.widgets.home import Home
from workbench.widgets.notices import Notice, Notices


class ErrorLine:
    """Shows the notices of a home, with a button that dismisses them; nothing while there are none.

    Args:
        home: whose notices.

    Attributes:
        view: what to place.
    """

    def __init__(self, home: Home) -> None:
        self._text = ipywidgets.HTML(layout={"flex": "1 1 auto", "min_width": "0"})
        self._dismiss = ipywidgets.Button(description="Dismiss")
        self._dismiss.on_click(home.wrap(lambda _: home.notices.dismiss()))
        self.view = ipywidgets.HBox([self._text, self._dismiss], layout={"width": "100%"})
        home.notices.observe(home.wrap(lambda _: self._show(home.notices)), "shown")
        self._show(home.notices)

    def _show(self, notices: Notices) -> None:
        shown = "".join(map(_block, notices.shown))
        self._text.value = f'<div role="alert">{shown}</div>' if shown else ""
        self.view.layout.display = "flex" if shown else "none"


def _block(notice: Notice) -> str:
    said = f'<span style="font-family: monospace">{html.escape(notice.text)}</span>'
    text = f"<b>{notice.kind.value}</b><br>{said}"
    details = ""
    if notice.details:
        inner = f'<pre style="overflow-x: auto">{html.escape(notice.details)}</pre>'
        details = f"<details><summary>What to send to whoever keeps oddsbench</summary>{inner}</details>"
    return (
        '<div style="white-space: pre-wrap; overflow-wrap: anywhere; line-height: 1.4; margin: 2px 0;'
        f' padding: 4px 10px; border-left: 4px solid #b0481f">{text}{details}</div>'
    )
