"""The line that tells how a piece of work stands, with its progress and its Cancel."""

from __future__ import annotations

import html
from collections.abc import Callable

import ipywidgets

from workbench.widgets.home import Home
from workbench.widgets.jobs.work import Stage, Standing, Work


class WorkLine:
    """Tells how a piece of work stands; its Cancel works while it computes.

    Args:
        home: where callbacks run.
        work: what it tells of.
        cancel: what Cancel does.

    Attributes:
        view: what to place.
    """

    def __init__(self, home: Home, work: Work, cancel: Callable[[], object]) -> None:
        self._text = ipywidgets.HTML(layout={"flex": "1 1 auto", "min_width": "0"})
        self.cancel = ipywidgets.Button(description="Cancel")
        self.cancel.on_click(home.wrap(lambda _: cancel()))
        self.view = ipywidgets.HBox([self._text, self.cancel], layout={"width": "100%"})
        work.observe(home.wrap(lambda _: self._show(work.standing)), "standing")
        self._show(work.standing)

    def _show(self, standing: Standing) -> None:
        self.cancel.disabled = standing.stage is not Stage.COMPUTING
        self._text.value = _line(standing)


def _line(standing: Standing) -> str:
    """Return the line as HTML; only what changes rarely is read out by itself."""
    progress = standing.progress
    if standing.stage is Stage.COMPUTING and progress is not None:
        label = html.escape(f"Progress of {standing.asked}", quote=True)
        bar = f'<progress max="1" value="{progress.share:.3f}" aria-label="{label}"></progress>'
        return f"{_spoken(f'Computing {standing.asked}')} {bar} {html.escape(progress.text())}"
    return _spoken(standing.text())


def _spoken(text: str) -> str:
    return f'<span role="status" style="white-space: pre-wrap">{html.escape(text)}</span>'
