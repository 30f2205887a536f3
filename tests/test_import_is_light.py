"""`import workbench` stays light: it is paid by every command and every notebook, used or not."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

ROOT = Path(__file__).parents[1]
HEAVY = (
    "scipy.stats",
    "scipy.optimize",
    "iminuit",
    "matplotlib",
    "ipywidgets",
    "anywidget",
    "tomlkit",
    "jupyterlab",
)


def loaded_after(statement: str) -> list[str]:
    code = f"import sys\n{statement}\nprint(*(name for name in {HEAVY!r} if name in sys.modules))"
    run = subprocess.run([sys.executable, "-c", code], cwd=ROOT, capture_output=True, text=True, check=True)
    return run.stdout.split()


def test_importing_workbench_loads_nothing_heavy() -> None:
    assert loaded_after("import workbench") == []


def test_the_nouns_of_an_analysis_load_nothing_heavy() -> None:
    assert loaded_after("import workbench as wb\nwb.Analysis, wb.Region, wb.Normal, wb.Gaussian") == []


def test_a_heavy_import_would_be_seen() -> None:
    assert loaded_after("import scipy.stats") == ["scipy.stats", "scipy.optimize"]
