"""The file of the analysis in hand: opened, and saved with its comments kept."""

from __future__ import annotations

from pathlib import Path

import traitlets

from workbench.counts.csv_table import read_csv_table
from workbench.counts.files import digest_of, read_bytes, text_of
from workbench.errors import InputError, Problem, quoted
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.bare import analysis_from_table
from workbench.hypotheses.faults import KeyPath
from workbench.hypotheses.file.kinds import (
    ANALYSES,
    HISTOGRAMS,
    existing_file_problem,
    unknown_kind_problem,
)
from workbench.hypotheses.file.reading import parsed, read_analysis
from workbench.hypotheses.file.writing import write_analysis
from workbench.widgets.state.editing import Editing

OPEN: KeyPath = ("file to open",)
SAVE: KeyPath = ("file to save",)


class FileInHand(traitlets.HasTraits):
    """Where the analysis in hand comes from, and where it goes.

    Problems stand under the controls `OPEN` and `SAVE`, and what is in hand stays as it is.

    Args:
        editing: what is in hand.

    Attributes:
        name: the file as the user gave it; empty where the analysis was declared in Python.
    """

    name = traitlets.Unicode()

    def __init__(self, editing: Editing) -> None:
        super().__init__()
        self.editing = editing
        self._digest = ""

    def open(self, name: str, *, loses_changes: bool = False) -> bool:
        """Take the analysis of a file into hand, or the one that a histogram file alone stands for.

        Args:
            name: an analysis or a histogram file.
            loses_changes: give up changes that were not saved; without it they are an obstacle.

        Returns:
            True if it is in hand now.
        """
        if self.editing.is_dirty and not loses_changes:
            self.editing.refuse(OPEN, [_unsaved(self.name)])
            return False
        try:
            digest = digest_of(read_bytes(Path(name), name))
            analysis = _read(name)
        except InputError as error:
            self.editing.refuse(OPEN, error.problems)
            return False
        self._digest, self.name = digest, name
        self.editing.hold(analysis)
        return True

    def hold(self, analysis: Analysis) -> None:
        """Take an analysis that was declared in Python into hand; it has no file yet."""
        self._digest, self.name = "", ""
        self.editing.hold(analysis)

    def save(self, name: str = "", *, replaces: bool = False) -> bool:
        """Write what is in hand to an analysis file that is read back as the same.

        Comments and order of the file that it comes from are kept where the content stays.

        Args:
            name: the file; left out, the one that it comes from.
            replaces: write over another file that exists, or over the own one though somebody else has
                changed it.

        Returns:
            True if it was written.

        Raises:
            ValueError: if no analysis is in hand.
        """
        analysis = self.editing.analysis
        if analysis is None:
            raise ValueError("no analysis is in hand")
        target = name or self.name
        try:
            self._refuse_target(target, replaces=replaces)
            write_analysis(analysis, Path(target), keep=self._kept())
            self._digest = digest_of(read_bytes(Path(target), target))
        except InputError as error:
            self.editing.refuse(SAVE, error.problems)
            return False
        self.name = target
        self.editing.dismiss(SAVE)
        self.editing.settle(analysis)
        return True

    def _kept(self) -> Path | None:
        """Return the file whose comments are kept; None where there is none that can be read now."""
        if Path(self.name).suffix.lower() not in ANALYSES:
            return None
        try:
            parsed(text_of(read_bytes(Path(self.name), self.name), self.name), self.name)
        except InputError:
            return None
        return Path(self.name)

    def _refuse_target(self, target: str, *, replaces: bool) -> None:
        if Path(target).suffix.lower() not in ANALYSES or not target.isprintable():
            raise InputError(
                Problem(
                    "A name that no analysis file has",
                    "file to save",
                    quoted(target),
                    f"a name that can be read and ends in {ANALYSES[0]}",
                    f"write a name such as analysis{ANALYSES[0]}",
                )
            )
        if replaces or not Path(target).exists():
            return
        if not self._is_own(target):
            raise InputError(existing_file_problem("file to save", target))
        if digest_of(read_bytes(Path(target), target)) != self._digest:
            raise InputError(
                Problem(
                    "A file that was changed since it was read",
                    "file to save",
                    quoted(target),
                    "the file as it was read: what was changed there would be lost",
                    "save under another name, or open the file again",
                )
            )

    def _is_own(self, target: str) -> bool:
        return bool(self.name) and Path(target).resolve() == Path(self.name).resolve()


def _read(name: str) -> Analysis:
    suffix = Path(name).suffix.lower()
    if suffix in ANALYSES:
        return read_analysis(name)
    if suffix in HISTOGRAMS:
        return analysis_from_table(read_csv_table(Path(name), name))
    raise InputError(unknown_kind_problem(name, name))


def _unsaved(name: str) -> Problem:
    return Problem(
        "Changes that are not saved",
        "file to open",
        quoted(name) if name else "an analysis that is in no file",
        "nothing that would be lost",
        "save them, undo them, or open the file all the same",
    )
