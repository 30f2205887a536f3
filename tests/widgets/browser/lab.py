"""A JupyterLab that keeps everything in a throw-away folder, and a Chromium that reaches nothing else."""

from __future__ import annotations

import contextlib
import json
import os
import secrets
import shutil
import socket
import subprocess
import sys
import time
import urllib.request
from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING, Any

import pytest

if TYPE_CHECKING:
    from playwright.sync_api import ConsoleMessage, Page

ROOT = Path(__file__).parents[3]
NAMES = ("chromium", "chromium-browser", "google-chrome")
FLAGS = [
    "--no-sandbox",  # root in a container
    "--disable-gpu",
    "--disable-dev-shm-usage",
    "--host-resolver-rules=MAP * ~NOTFOUND , EXCLUDE 127.0.0.1",  # nothing but the loopback is reached
]
SETTINGS: dict[str, dict[str, Any]] = {
    "@jupyterlab/apputils-extension:notification": {"fetchNews": "false", "checkForUpdates": False},
    "@jupyterlab/docmanager-extension:plugin": {"autosave": False},
    "@jupyterlab/notebook-extension:tracker": {"autoStartDefaultKernel": True, "windowingMode": "none"},
    "@jupyterlab/extensionmanager-extension:plugin": {"enabled": False},
    "@jupyter-widgets/jupyterlab-manager:plugin": {"saveState": False},
}
# Said by JupyterLab itself on every start, about nothing of ours.
NOISE = ("favicon", "ResizeObserver loop", "preloaded using link preload", "terminals plugin")


def chromium() -> str:
    """Return the path of Chromium, or skip the test."""
    named = os.environ.get("CHROMIUM")
    found = named or next(filter(None, map(shutil.which, NAMES)), None)
    if found is None:
        pytest.skip("no Chromium: apt-get install chromium, or name one in $CHROMIUM")
    return found


class Lab:
    """A JupyterLab server of one folder."""

    def __init__(self, root: Path, kept: Path) -> None:
        self.root, self._kept, self.token = root, kept, secrets.token_hex(16)
        with socket.socket() as free:
            free.bind(("127.0.0.1", 0))
            self.port: int = free.getsockname()[1]
        self.url = f"http://127.0.0.1:{self.port}"

    def ask(self, method: str, path: str) -> Any:
        """Ask the server's own interface."""
        headers = {"Authorization": f"token {self.token}"}
        request = urllib.request.Request(self.url + path, method=method, headers=headers)
        with urllib.request.urlopen(request, timeout=10) as answer:
            content = answer.read()
        return json.loads(content) if content else None

    @contextlib.contextmanager
    def running(self) -> Iterator[Lab]:
        """Run the server until the block ends."""
        command = [
            sys.executable, "-m", "jupyterlab", "--no-browser", "--allow-root", "--ServerApp.ip=127.0.0.1",
            f"--ServerApp.port={self.port}", "--ServerApp.port_retries=0",
            f"--ServerApp.root_dir={self.root}", "--ServerApp.terminals_enabled=False",
            "--LabApp.expose_app_in_browser=True", "--LabApp.extension_manager=readonly",
            "--LabApp.news_url=None",
        ]  # fmt: skip
        with (self._kept / "server.log").open("wb") as log:
            server = subprocess.Popen(
                command, stdout=log, stderr=log, stdin=subprocess.DEVNULL, env=self._environment()
            )
        try:
            self._wait(server)
            yield self
        finally:
            with contextlib.suppress(OSError):
                self.ask("POST", "/api/shutdown")
            try:
                server.wait(15)
            except subprocess.TimeoutExpired:
                server.kill()
                server.wait(5)

    def _environment(self) -> dict[str, str]:
        for plugin, values in SETTINGS.items():
            package, _, name = plugin.partition(":")
            file = self._kept / "settings" / package / f"{name}.jupyterlab-settings"
            file.parent.mkdir(parents=True)
            file.write_text(json.dumps(values))
        folders = {
            "JUPYTER_CONFIG_DIR": "config", "JUPYTER_DATA_DIR": "data", "JUPYTER_RUNTIME_DIR": "runtime",
            "JUPYTERLAB_WORKSPACES_DIR": "workspaces", "JUPYTERLAB_SETTINGS_DIR": "settings",
            "IPYTHONDIR": "ipython",
        }  # fmt: skip
        kept = {name: str(self._kept / folder) for name, folder in folders.items()}
        inherited = {
            name: value for name, value in os.environ.items() if not name.startswith(("JUPYTER", "MPL"))
        }
        return {**inherited, **kept, "JUPYTER_TOKEN": self.token, "PYTHONPATH": str(ROOT)}

    def _wait(self, server: subprocess.Popen[bytes]) -> None:
        end = time.monotonic() + 60.0
        while True:
            with contextlib.suppress(OSError):
                self.ask("GET", "/api/status")
                return
            log = self._kept / "server.log"
            assert server.poll() is None, log.read_text(errors="replace")
            assert time.monotonic() < end, log.read_text(errors="replace")
            time.sleep(0.1)


class Notebook:
    """One notebook open in JupyterLab, and what the browser's console said."""

    def __init__(self, page: Page, lab: Lab, name: str) -> None:
        self.page, self.lab, self.name = page, lab, name
        self.console: list[str] = []
        page.on("console", self._note)
        page.on("pageerror", lambda error: self.console.append(str(error)))
        page.goto(f"{lab.url}/lab/workspaces/{secrets.token_hex(4)}/tree/{name}?token={lab.token}")
        self._wait()

    def _note(self, message: ConsoleMessage) -> None:
        if message.type == "error" and not any(noise in message.text for noise in NOISE):
            self.console.append(message.text)

    def _wait(self) -> None:
        self.page.wait_for_selector(".jp-Notebook .jp-Cell", timeout=60_000)
        self.page.wait_for_function(
            "() => window.jupyterapp.shell.currentWidget?.sessionContext?.session?.kernel?.status === 'idle'",
            timeout=60_000,
        )

    def reload(self) -> None:
        """Load the page again, as its user might."""
        self.page.reload()
        self._wait()

    def command(self, name: str, **arguments: Any) -> None:
        """Run one of JupyterLab's commands."""
        run = "async ([name, arguments_]) => { await window.jupyterapp.commands.execute(name, arguments_); }"
        self.page.evaluate(run, [name, arguments])

    def run(self) -> None:
        """Run all cells."""
        self.command("notebook:run-all-cells")

    def save(self) -> None:
        """Save the notebook as it is shown."""
        self.page.evaluate("async () => { await window.jupyterapp.shell.currentWidget.context.save(); }")

    def cells(self) -> int:
        """Return the number of cells."""
        count: int = self.page.evaluate("() => window.jupyterapp.shell.currentWidget.content.widgets.length")
        return count

    def active_cell(self) -> int:
        """Return the place of the selected cell."""
        place: int = self.page.evaluate("() => window.jupyterapp.shell.currentWidget.content.activeCellIndex")
        return place
