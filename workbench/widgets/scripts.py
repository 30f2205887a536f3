"""The scripts and styles that run in the page, read from the files beside this one."""

from __future__ import annotations

from pathlib import Path

_FOLDER = Path(__file__).parent / "in_page"


def script(name: str) -> str:
    """Return a file of `in_page/`.

    Args:
        name: of the file.
    """
    return (_FOLDER / name).read_text(encoding="utf-8")
