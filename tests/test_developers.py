"""The contributors' guide stays short and names what is there."""

from __future__ import annotations

import re
from pathlib import Path

from tests.test_layers import PLACES

ROOT = Path(__file__).parents[1]
GUIDE = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")
TO_BE_WRITTEN = re.compile(r"NOUN|NAME|FORMAT|CASE|\*")


def test_the_guide_is_at_most_150_lines() -> None:
    assert len(GUIDE.splitlines()) <= 150


def test_the_guide_shows_the_layers_that_the_layer_test_keeps() -> None:
    assert " <- ".join(PLACES) in GUIDE


def test_every_file_that_the_guide_names_is_there() -> None:
    files = [path.relative_to(ROOT).as_posix() for path in ROOT.rglob("*") if path.suffix in {".py", ".toml"}]
    named = {
        name for name in re.findall(r"`([\w/.]+\.(?:py|toml))`", GUIDE) if not TO_BE_WRITTEN.search(name)
    }
    assert len(named) > 30
    assert [
        name for name in sorted(named) if not any(f"/{file}".endswith(f"/{name}") for file in files)
    ] == []
