"""What only a browser can break: the bench's parts in a real JupyterLab, driven with keys and clicks."""

from __future__ import annotations

import os
import time
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import TYPE_CHECKING, Any

import nbformat
import numpy as np
import pytest

from tests.widgets.browser.lab import FLAGS, Lab, Notebook, chromium
from tests.widgets.browser.tiny_app import expected, total
from workbench.plots.palette import DARK, LIGHT

if TYPE_CHECKING:
    from playwright.sync_api import Locator

STEPS = 20
CELLS = (
    "from tests.widgets.browser.tiny_app import tiny_app\ntiny_app()",
    "import ipywidgets\nipywidgets.Button(description='Unprotected')",
)
# Notes when a control was moved, when a picture was painted, and when a text was first there.
WATCH = """() => {
  const seen = window.seen = { moved: [], painted: [], cancelled: [], pressed: [] };
  const now = () => performance.now();
  window.addEventListener('input', () => seen.moved.push(now()), true);
  window.addEventListener('click', () => seen.pressed.push(now()), true);
  new MutationObserver((changes) => {
    if (changes.some((change) => change.attributeName === 'data-painted')) seen.painted.push(now());
    const text = document.querySelector('.jp-Notebook')?.textContent || '';
    if (text.includes('Cancelled: a long run')) seen.cancelled.push(now());
  }).observe(document.body, { subtree: true, childList: true, characterData: true, attributes: true,
                              attributeFilter: ['data-painted'] });
}"""
CORNER = """() => { const canvas = document.querySelector('.oddsbench-canvas canvas');
  const [r, g, b] = canvas.getContext('2d').getImageData(2, 2, 1, 1).data;
  return '#' + [r, g, b].map((part) => part.toString(16).padStart(2, '0')).join(''); }"""


@pytest.fixture(scope="module")
def notebook(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Notebook]:
    playwright = pytest.importorskip("playwright.sync_api", reason="no Playwright: pip install playwright")
    executable = chromium()
    work, kept = tmp_path_factory.mktemp("work"), tmp_path_factory.mktemp("kept")
    made: Any = nbformat.v4.new_notebook()  # type: ignore[no-untyped-call]
    made.cells = [nbformat.v4.new_code_cell(code) for code in CELLS]  # type: ignore[no-untyped-call]
    nbformat.write(made, work / "tiny.ipynb")  # type: ignore[no-untyped-call]
    with Lab(work, kept).running() as lab, playwright.sync_playwright() as started:
        browser = started.chromium.launch(executable_path=executable, args=FLAGS)
        page = browser.new_page(viewport={"width": 1200, "height": 1100})
        opened = Notebook(page, lab, "tiny.ipynb")
        opened.run()
        page.wait_for_selector(".oddsbench-canvas-box[data-painted]")
        page.wait_for_selector("button:has-text('Unprotected')")
        page.evaluate(WATCH)
        yield opened
        browser.close()


def eventually(condition: Callable[[], bool], seconds: float = 10.0) -> None:
    end = time.monotonic() + seconds
    while not condition():
        assert time.monotonic() < end, "it did not happen"
        time.sleep(0.02)


def look_at(notebook: Notebook, name: str) -> None:
    """Keep a picture of the page where $ODDSBENCH_PICTURES says."""
    folder = os.environ.get("ODDSBENCH_PICTURES")
    if folder:
        notebook.page.screenshot(path=Path(folder) / f"{name}.png")


def seen(notebook: Notebook, what: str) -> list[float]:
    times: list[float] = notebook.page.evaluate("(what) => window.seen[what]", what)
    return times


def slider(notebook: Notebook) -> Locator:
    return notebook.page.get_by_role("slider", name="Signal strength, slider")


def picture(notebook: Notebook) -> Locator:
    return notebook.page.locator(".oddsbench-canvas-box")


def opacity(notebook: Notebook) -> str:
    drawn = picture(notebook).locator("canvas").first
    shown: str = drawn.evaluate("(canvas) => getComputedStyle(canvas).opacity")
    return shown


def alt_is(notebook: Notebook, strength: float) -> bool:
    return picture(notebook).get_attribute("aria-label") == total(expected(strength))


def move(notebook: Notebook, key: str) -> float:
    """Press a key on the slider and return the time until the new picture was painted [ms]."""
    before = len(seen(notebook, "painted"))
    slider(notebook).press(key)
    eventually(lambda: len(seen(notebook, "painted")) > before)
    return seen(notebook, "painted")[before] - seen(notebook, "moved")[-1]


@pytest.mark.browser
@pytest.mark.slow
@pytest.mark.filterwarnings("ignore::ResourceWarning")
class TestInJupyterLab:
    """One page, used from top to bottom as its user would."""

    def test_everything_can_be_found_by_its_name(self, notebook: Notebook) -> None:
        page = notebook.page
        for role, name in [
            ("slider", "Signal strength, slider"),
            ("textbox", "Signal strength"),
            ("group", "Mood"),
            ("img", total(expected(1.0))),
            ("button", "Cancel"),
        ]:
            found = page.get_by_role(role, name=name, exact=True)  # type: ignore[arg-type]
            assert found.count() == 1, (role, name)
        assert page.locator('.jp-Notebook [title="null"]').count() == 0
        look_at(notebook, "light")

    def test_a_slider_moves_the_picture_at_once(self, notebook: Notebook) -> None:
        took = [move(notebook, "ArrowRight") for _ in range(STEPS)]
        print(f"slider to picture: {np.percentile(took, [50, 95]).round()} ms")
        eventually(lambda: alt_is(notebook, 1.0 + 0.05 * STEPS))
        assert np.median(took) < 300.0

    def test_a_drag_shows_pictures_on_the_way_and_ends_where_the_hand_does(self, notebook: Notebook) -> None:
        box = slider(notebook).bounding_box()
        assert box is not None
        before, mouse = len(seen(notebook, "painted")), notebook.page.mouse
        middle = box["y"] + box["height"] / 2
        mouse.move(box["x"] + 0.40 * box["width"], middle)
        mouse.down()
        for share in np.linspace(0.40, 0.80, 30):
            mouse.move(box["x"] + share * box["width"], middle)
            time.sleep(0.02)
        mouse.up()
        value = notebook.page.get_by_role("textbox", name="Signal strength").input_value
        eventually(lambda: alt_is(notebook, float(value())))
        assert 3.5 < float(value()) < 4.5
        assert len(seen(notebook, "painted")) - before >= 3

    def test_a_typed_number_may_lie_beyond_the_slider_and_words_are_refused(self, notebook: Notebook) -> None:
        box = notebook.page.get_by_role("textbox", name="Signal strength")
        box.fill("7.25")
        box.press("Enter")
        eventually(lambda: alt_is(notebook, 7.25))
        assert box.input_value() == "7.25"
        box.fill("many")
        box.press("Enter")
        notebook.page.get_by_text('found     "many"').wait_for()
        eventually(lambda: box.input_value() == "7.25")
        look_at(notebook, "refused")
        box.fill("2")
        box.press("Enter")
        eventually(lambda: alt_is(notebook, 2.0))
        assert notebook.page.get_by_text('"many"').count() == 0

    def test_numbers_are_read_out_under_the_pointer_and_the_arrow_keys(self, notebook: Notebook) -> None:
        readout = notebook.page.locator(".oddsbench-canvas-readout")
        picture(notebook).focus()
        picture(notebook).press("Home")
        assert readout.inner_text() == f"20 to 22 GeV: {expected(2.0)[0]:.2f} events"
        picture(notebook).press("ArrowRight")
        assert readout.inner_text() == f"22 to 24 GeV: {expected(2.0)[1]:.2f} events"
        box = picture(notebook).bounding_box()
        assert box is not None
        across = 0.09 + 0.88 * (45.0 - 20.0) / 60.0  # of the axes' place, see draw
        notebook.page.mouse.move(box["x"] + across * box["width"], box["y"] + 0.5 * box["height"])
        assert readout.inner_text().startswith("44 to 46 GeV")
        look_at(notebook, "readout")

    def test_no_key_pressed_inside_reaches_the_notebook(self, notebook: Notebook) -> None:
        """`d d` on a button deleted the cell that held the bench."""
        page, cells, active = notebook.page, notebook.cells(), notebook.active_cell()
        for inside in [
            page.get_by_role("button", name="Break", exact=True),
            picture(notebook),
            slider(notebook),
        ]:
            inside.focus()
            for key in ["d", "d", "b", "x", "ArrowDown", "ArrowUp", "Shift+Enter", "Control+Enter"]:
                page.keyboard.press(key)
        assert (notebook.cells(), notebook.active_cell()) == (cells, active)
        page.get_by_role("button", name="Unprotected", exact=True).focus()
        page.keyboard.press("d")
        page.keyboard.press("d")
        eventually(lambda: notebook.cells() == cells - 1)  # so the test can fail

    def test_what_a_callback_raises_or_prints_is_shown_and_can_be_dismissed(self, notebook: Notebook) -> None:
        page = notebook.page
        page.get_by_role("button", name="Dismiss", exact=True).click()  # the keys above pressed Break
        page.get_by_role("button", name="Break", exact=True).click()
        page.get_by_role("alert").filter(has_text="ZeroDivisionError: division by zero").wait_for()
        page.get_by_role("button", name="Talk", exact=True).click()
        page.get_by_text("said aside").wait_for()
        look_at(notebook, "errors")
        page.get_by_role("button", name="Dismiss", exact=True).click()
        page.get_by_text("said aside").wait_for(state="hidden")

    def test_cancel_works_while_it_computes_and_so_does_the_slider(self, notebook: Notebook) -> None:
        page = notebook.page
        page.get_by_role("button", name="Long run", exact=True).click()
        page.get_by_text("50 %").wait_for()
        took = [move(notebook, "ArrowLeft") for _ in range(5)]
        look_at(notebook, "computing")
        page.get_by_role("button", name="Cancel", exact=True).click()
        page.get_by_text("Cancelled: a long run").wait_for()
        stopped = seen(notebook, "cancelled")[0] - seen(notebook, "pressed")[-1]
        print(f"while computing: slider {np.median(took):.0f} ms, Cancel {stopped:.0f} ms")
        assert stopped < 400.0
        assert np.median(took) < 600.0

    def test_while_the_next_is_computed_the_last_picture_is_grey_and_named(self, notebook: Notebook) -> None:
        page = notebook.page
        page.get_by_role("button", name="busy", exact=True).click()
        slider(notebook).press("ArrowRight")
        page.get_by_text("Still shown: strength 1.75").wait_for()
        eventually(lambda: float(opacity(notebook)) < 0.5)
        look_at(notebook, "stale")
        eventually(lambda: alt_is(notebook, 1.8))
        page.get_by_text("Still shown").wait_for(state="hidden")
        assert float(opacity(notebook)) == 1.0
        page.get_by_role("button", name="calm", exact=True).click()
        move(notebook, "ArrowLeft")

    def test_the_picture_follows_the_theme(self, notebook: Notebook) -> None:
        assert notebook.page.evaluate(CORNER) == LIGHT.paper
        notebook.command("apputils:change-theme", theme="JupyterLab Dark")
        eventually(lambda: bool(notebook.page.evaluate(CORNER) == DARK.paper))
        notebook.page.wait_for_selector("#jupyterlab-splash", state="detached")
        look_at(notebook, "dark")
        notebook.command("apputils:change-theme", theme="JupyterLab Light")
        eventually(lambda: bool(notebook.page.evaluate(CORNER) == LIGHT.paper))

    def test_a_page_loaded_again_shows_the_state_and_goes_on(self, notebook: Notebook) -> None:
        page = notebook.page
        page.get_by_role("button", name="Long run", exact=True).click()
        page.get_by_text("50 %").wait_for()
        notebook.save()
        notebook.reload()
        page.wait_for_selector(".oddsbench-canvas-box[data-painted]")
        page.evaluate(WATCH)
        eventually(lambda: alt_is(notebook, 1.75))
        assert slider(notebook).get_attribute("aria-valuetext") == "1.75"
        move(notebook, "ArrowRight")
        eventually(lambda: alt_is(notebook, 1.8))
        page.get_by_role("button", name="Cancel", exact=True).click()
        page.get_by_text("Cancelled: a long run").wait_for()

    def test_the_console_and_the_error_line_stayed_clean(self, notebook: Notebook) -> None:
        assert "".join(notebook.page.get_by_role("alert").all_inner_texts()) == ""
        assert notebook.console == []

    def test_the_saved_notebook_shows_the_results_without_a_kernel_and_exported(
        self, notebook: Notebook
    ) -> None:
        page = notebook.page
        page.wait_for_timeout(1500)  # until the summary has settled
        assert page.locator("table:has-text('strength')").filter(visible=True).count() == 0
        notebook.save()
        for session in notebook.lab.ask("GET", "/api/sessions"):
            notebook.lab.ask("DELETE", f"/api/sessions/{session['id']}")
        notebook.reload()
        page.get_by_role("cell", name=total(expected(1.8))).wait_for()
        assert page.get_by_text("Error displaying widget").filter(visible=True).count() == 0
        look_at(notebook, "without-kernel")
        copied = nbformat.read(notebook.lab.root / "tiny.ipynb", 4)  # type: ignore[no-untyped-call]
        copied.cells.append(nbformat.v4.new_markdown_cell("from a colleague"))  # type: ignore[no-untyped-call]
        nbformat.write(copied, notebook.lab.root / "untrusted.ipynb")  # type: ignore[no-untyped-call]
        untrusted = Notebook(page, notebook.lab, "untrusted.ipynb")
        page.get_by_role("cell", name=total(expected(1.8))).wait_for()
        look_at(untrusted, "untrusted")
        from nbconvert import HTMLExporter

        exported, _ = HTMLExporter().from_filename(str(notebook.lab.root / "tiny.ipynb"))  # type: ignore[no-untyped-call]
        other = page.context.browser.new_page() if page.context.browser else page
        other.set_content(exported, wait_until="domcontentloaded")
        assert other.get_by_role("cell", name=total(expected(1.8))).is_visible()
        shown = other.get_by_role("img", name=total(expected(1.8)))
        assert shown.is_visible()
        assert shown.evaluate("(image) => image.naturalWidth") == 800
        other.close()
