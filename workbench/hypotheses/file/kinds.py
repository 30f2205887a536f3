"""Which kind of file is read as what, told by its ending."""

from __future__ import annotations

from pathlib import Path

from workbench.errors import Problem, quoted

ANALYSES = (".toml",)
HISTOGRAMS = (".csv", ".tsv", ".txt")


def unknown_kind_problem(path: str | Path, shown_as: str) -> Problem:
    """Return the problem of a file that is neither an analysis nor a histogram.

    Args:
        path: the file.
        shown_as: its name as the user gave it.
    """
    suffix = Path(path).suffix.lower()
    return Problem(
        "A kind of file that is not read",
        shown_as,
        f"the ending {quoted(suffix)}" if suffix else "a name without an ending",
        f"an analysis ({', '.join(ANALYSES)}) or a histogram ({', '.join(HISTOGRAMS)})",
        "save it as CSV with the columns low,high,observed",
    )


def existing_file_problem(place: str, name: str) -> Problem:
    """Return the problem of a file that would be written over.

    Args:
        place: the option or control that names it.
        name: the file.
    """
    return Problem(
        "File exists already", place, quoted(name), "a new file", "choose another name, or remove it first"
    )
