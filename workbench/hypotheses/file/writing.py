"""Writes analysis files: whole or not at all, and read back as they were."""

from __future__ import annotations

import contextlib
from pathlib import Path
from typing import TYPE_CHECKING, cast

from workbench.counts.files import read_bytes, text_of, write_text_atomically
from workbench.errors import InputError, Problem
from workbench.hypotheses.analysis import Analysis, default_hypotheses
from workbench.hypotheses.contents import Content, content_of
from workbench.hypotheses.file.reading import analysis_from_text, parsed
from workbench.hypotheses.file.table_files import Bins, bins_of
from workbench.hypotheses.file.toml_text import file_text

if TYPE_CHECKING:
    from collections.abc import Mapping


def write_analysis(analysis: Analysis, path: str | Path, keep: str | Path | None = None) -> None:
    """Write an analysis file that is read back as the same analysis.

    A region's table is named where its file lies in reach of the new one and still holds the same numbers;
    otherwise its bins are written into the file, or, with templates, into a CSV file beside it.

    Args:
        analysis: the analysis.
        path: the file to write; an existing one is replaced.
        keep: an earlier version, perhaps the same file; its comments and order stay where the content does.

    Raises:
        InputError: if the file cannot be written, or `keep` cannot be read.

    Source:
        none, definition
    """
    place = Path(path)
    original = None if keep is None else text_of(read_bytes(Path(keep), str(keep)), str(keep))
    earlier = {} if original is None else parsed(original, str(keep))
    bins = _bins(analysis, place, earlier)
    written: list[Path] = []
    try:
        for one in bins.values():
            if one.path is not None:
                write_text_atomically(one.path, one.text)
                written.append(one.path)
        write_text_atomically(place, _text(analysis, place, bins, original, earlier))
    except BaseException:
        for table in written:
            with contextlib.suppress(OSError):
                table.unlink()
        raise


def _bins(analysis: Analysis, path: Path, earlier: Mapping[str, object]) -> dict[str, Bins]:
    regions = earlier.get("regions")
    found: dict[str, Bins] = {}
    taken: set[str] = set()
    for region in analysis.regions:
        said = regions.get(region.name) if isinstance(regions, dict) else None
        table = said.get("table") if isinstance(said, dict) else None
        found[region.name] = bins_of(region, path, table if isinstance(table, str) else None, taken)
    return found


def _text(
    analysis: Analysis,
    path: Path,
    bins: Mapping[str, Bins],
    original: str | None,
    earlier: Mapping[str, object],
) -> str:
    """Return the text to write, with the original's comments if that is read back as the same analysis."""
    content = content_of(analysis)
    regions = cast("dict[str, Content]", content["regions"])
    for name, one in bins.items():
        regions[name] = one.keys | regions[name]
    if original is not None:
        is_default = analysis.hypotheses == default_hypotheses(analysis.processes)
        kept = {
            key: value
            for key, value in content.items()
            if not (key == "hypotheses" and key not in earlier and is_default)
            and not (key == "title" and key not in earlier and value == path.stem)
        }
        text = _merged(original, kept)
        if text is not None and _reads_back(text, path, analysis):
            return text
    text = file_text(content)
    if not _reads_back(text, path, analysis):
        raise InputError(
            Problem(
                "An analysis that a file cannot hold",
                str(path),
                "names or numbers that are not read back as they were",
                "names that can be printed, column names without spaces at their ends",
                "rename the columns and regions that have unusual characters",
            )
        )
    return text


def _merged(original: str, content: Content) -> str | None:
    """Return the original with the new content, or None where its layout cannot be edited in place."""
    from workbench.hypotheses.file.merging import merged_text  # tomlkit is slow and needed only here

    try:
        return merged_text(original, content)
    except (ValueError, KeyError, TypeError, AttributeError, IndexError):
        # tomlkit cannot edit every layout that it can read; the content is then written without the comments.
        return None


def _reads_back(text: str, path: Path, analysis: Analysis) -> bool:
    try:
        return analysis_from_text(text, path.parent, str(path)) == analysis
    except InputError:
        return False
