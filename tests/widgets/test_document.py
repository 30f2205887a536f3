"""A saved notebook shows the last results, with nothing alive."""

from __future__ import annotations

import base64
import io
import os
import warnings
from collections.abc import Callable
from pathlib import Path
from typing import Any

import ipywidgets
import nbformat
import numpy as np
import pytest
from PIL import Image

from tests.widgets.front_end import FrontEnd
from workbench.widgets.document import Document, Summary
from workbench.widgets.home import Home

with warnings.catch_warnings():
    warnings.simplefilter("ignore", DeprecationWarning)  # of the libraries that it imports, not of ours
    from nbclient import NotebookClient

ROOT = Path(__file__).parents[2]
Until = Callable[[Callable[[], bool]], None]


def png() -> bytes:
    content = io.BytesIO()
    Image.fromarray(np.full((2, 3, 3), 200, dtype=np.uint8)).save(content, format="png")
    return content.getvalue()


def test_the_summary_holds_the_numbers_and_the_picture_escaped(
    front: FrontEnd, home: Home, until: Until
) -> None:
    document = Document("Odds at <Tern>", ipywidgets.VBox(), home)
    assert "no result yet" in document.bundle()["text/html"]
    document.keep(lambda: Summary((("posterior odds & more", "7.7 ± 0.1 : 1"),), (('a "ruler"', png()),)))
    until(lambda: "7.7" in document.bundle()["text/plain"])
    shown = document.bundle()
    assert shown["text/plain"] == "Odds at <Tern>\n  posterior odds & more: 7.7 ± 0.1 : 1"
    assert "<b>Odds at &lt;Tern&gt;</b>" in shown["text/html"]
    assert "posterior odds &amp; more" in shown["text/html"]
    assert 'alt="a &quot;ruler&quot;"' in shown["text/html"]
    encoded = shown["text/html"].split("base64,")[1].split('"')[0]
    assert base64.b64decode(encoded) == png()


def test_only_settled_results_are_written(front: FrontEnd, home: Home, until: Until) -> None:
    document, made = Document("Odds", ipywidgets.VBox(), home), list[int]()

    def maker(value: int) -> Callable[[], Summary]:
        def make() -> Summary:
            made.append(value)
            return Summary((("odds", str(value)),))

        return make

    for value in range(5):
        document.keep(maker(value))
    until(lambda: "odds: 4" in document.bundle()["text/plain"])
    assert made == [4]


CELL = """
import ipywidgets
from workbench.widgets.document import Document, Summary
from workbench.widgets.home import Home
from workbench.widgets.notices import Notices
document = Document("Odds", ipywidgets.VBox([]), Home(Notices()))
document
"""
LATER = """
import asyncio
document.keep(lambda: Summary((("posterior odds", "7.7"),)))
await asyncio.sleep(1.5)
"""


@pytest.mark.slow
@pytest.mark.filterwarnings("ignore::DeprecationWarning")
@pytest.mark.filterwarnings("ignore::ResourceWarning")
@pytest.mark.filterwarnings("ignore::UserWarning")
def test_a_result_that_comes_later_is_in_the_saved_cell_and_in_its_export(tmp_path: Path) -> None:
    notebook: Any = nbformat.v4.new_notebook()  # type: ignore[no-untyped-call]
    notebook.cells = [nbformat.v4.new_code_cell(code) for code in (CELL, LATER)]  # type: ignore[no-untyped-call]
    client = NotebookClient(
        notebook, timeout=120, kernel_name="python3", store_widget_state=False,
        resources={"metadata": {"path": str(tmp_path)}},
    )  # fmt: skip
    client.execute(env={**os.environ, "PYTHONPATH": str(ROOT)})
    live, saved = notebook.cells[0].outputs
    assert "application/vnd.jupyter.widget-view+json" in live.data
    assert live.data["text/plain"] == "Odds: run this cell for the live view"
    assert saved.data["text/plain"] == "Odds\n  posterior odds: 7.7"
    assert "7.7</td>" in saved.data["text/html"]
    assert notebook.cells[1].outputs == []
