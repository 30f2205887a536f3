"""A fault of ours, written down so that it can be sent."""

from __future__ import annotations

import os
import shlex
import tempfile
import traceback
from collections.abc import Sequence
from pathlib import Path

from workbench.errors import Problem


def fault_problem(error: BaseException, asked: Sequence[str]) -> Problem:
    """Write the traceback to a file and return the problem that names it.

    Args:
        error: what was raised.
        asked: the command line after the program's name.
    """
    command = shlex.join(["oddsbench", *asked])
    path = _write(error, command)
    kept = f"send {path} to whoever keeps oddsbench (read it first: it may name your files)"
    return Problem(
        "A fault of oddsbench, not of your input",
        command,
        f"{type(error).__name__}: {error}".strip().rstrip(":"),
        "an answer, or a problem in the input",
        kept if path else "run it again where a temporary file can be written, and send that file",
    )


def _write(error: BaseException, command: str) -> Path | None:
    try:
        from workbench.records.provenance import versions

        made_with = "\n".join(f"{name} {version}" for name, version in versions().items())
    except Exception as other:  # noqa: BLE001 -- a broken installation must not hide the first fault
        made_with = f"versions unknown: {other!r}"
    text = "".join(traceback.format_exception(error))
    try:
        handle, name = tempfile.mkstemp(prefix="oddsbench-fault-", suffix=".txt")
        with os.fdopen(handle, "w", encoding="utf-8", errors="backslashreplace") as stream:
            stream.write(f"{command}\n\n{made_with}\n\n{text}")
    except OSError:
        return None
    return Path(name)
