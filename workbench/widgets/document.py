"""What a saved notebook still shows: the live view, and beside it a summary for when nothing lives.

The cell gets two outputs. The first is the widget; the second a table with pictures, rewritten by its
display id with every settled result, so that whoever saves stores the newest. Each is hidden by a style that
the other carries: while the bench lives, its style hides the summary; where it is gone (reopened without a
kernel, exported), the summary's style hides what is left of it.
"""

from __future__ import annotations

import base64
import html
import secrets
from collections.abc import Callable
from dataclasses import dataclass
from functools import partial
from typing import Any

import ipywidgets

from workbench.widgets.error_line import ErrorLine
from workbench.widgets.home import Home
from workbench.widgets.jobs.newest import Newest
from workbench.widgets.jobs.work import Stage, Work
from workbench.widgets.page import Page

SETTLED = 0.8  # seconds without a newer result after which the summary is written


@dataclass(frozen=True, slots=True)
class Summary:
    """The results as a document shows them.

    Attributes:
        rows: names and values of the numbers.
        pictures: text alternatives and PNG bytes, drawn for paper.
    """

    rows: tuple[tuple[str, str], ...] = ()
    pictures: tuple[tuple[str, bytes], ...] = ()


class Document:
    """A view that leaves its results in the notebook; display it as a cell's last line.

    Args:
        title: of the view.
        view: what lives.
        home: where callbacks run; its notices are shown above the view.
        page: looks after the view; one of its own if None.
    """

    def __init__(self, title: str, view: ipywidgets.Widget, home: Home, page: Page | None = None) -> None:
        self.title = title
        self.key = "oddsbench-" + secrets.token_hex(4)
        self.page = Page() if page is None else page
        self._home = home
        self._work = Work()
        self._newest = Newest(self._work, home, lambda make: make(), on_the_way=False)
        self._work.observe(home.wrap(self._write), "standing")
        self.page.observe(home.wrap(self._rewrite), "renderings")
        self._handle: Any = None
        self._put_off: Callable[[], None] | None = None
        line = ErrorLine(home)
        self.view = ipywidgets.VBox([line.view, view, self.page, _style(_hiding_summary(self.key))])
        self.view.add_class(f"{self.key}-live")

    def keep(self, make: Callable[[], Summary]) -> None:
        """Put results into the document once they have settled; on the home thread.

        Args:
            make: makes the summary, on another thread; the latest that was given is asked.
        """
        if self._put_off is not None:
            self._put_off()
        self._put_off = self._home.later(SETTLED, partial(self._newest.request, "the summary", make))

    def bundle(self) -> dict[str, str]:
        """Return the summary as it is displayed: as HTML and as plain text."""
        summary = self._work.standing.result or Summary()
        return {"text/html": _html(self.title, self.key, summary), "text/plain": _plain(self.title, summary)}

    def _write(self, change: dict[str, Any]) -> None:
        if change["new"].stage is Stage.DONE and self._handle is not None:
            self._handle.update(self.bundle(), raw=True)
            self._rewrite()

    def _rewrite(self, _: object = None) -> None:
        self.page.rewrite(self.key, self.bundle())

    def _ipython_display_(self) -> None:
        from IPython.display import DisplayHandle

        make: Callable[..., Any] = DisplayHandle  # without types of its own
        view, self._handle = make(), make(self.key)
        live = self.view._repr_mimebundle_()
        view.display({**live, "text/plain": f"{self.title}: run this cell for the live view"}, raw=True)
        self._handle.display(self.bundle(), raw=True)


def _style(css: str) -> ipywidgets.HTML:
    return ipywidgets.HTML(f"<style>{css}</style>", layout={"display": "none"})


def _hiding_summary(key: str) -> str:
    return f".jp-OutputArea-child:has(.{key}-saved), .{key}-saved {{ display: none }}"


def _hiding_remains(key: str) -> str:
    """Return the style that hides the output before the summary, unless the view lives in it."""
    before = f".jp-OutputArea-child:has(+ .jp-OutputArea-child .{key}-saved)"
    return f"{before}:not(:has(.{key}-live)) {{ display: none }}"


def _html(title: str, key: str, summary: Summary) -> str:
    rows = "".join(
        f'<tr><th scope="row" style="text-align: left">{html.escape(name)}</th>'
        f'<td style="text-align: right">{html.escape(value)}</td></tr>'
        for name, value in summary.rows
    )
    pictures = "".join(
        f'<img alt="{html.escape(alt, quote=True)}" style="max-width: 100%; display: block"'
        f' src="data:image/png;base64,{base64.b64encode(png).decode("ascii")}">'
        for alt, png in summary.pictures
    )
    hint = "as last saved; run the cell for the live view" if summary.rows else "no result yet"
    return (
        f"<style>{_hiding_remains(key)}</style>"
        f'<div class="{key}-saved"><p><b>{html.escape(title)}</b> ({hint})</p>'
        f"<table>{rows}</table>{pictures}</div>"
    )


def _plain(title: str, summary: Summary) -> str:
    return "\n".join([title, *(f"  {name}: {value}" for name, value in summary.rows)])
