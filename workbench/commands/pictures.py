"""Pictures of a result, saved."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from workbench.commands.delivery import refuse_unwritable
from workbench.counts.files import write_bytes_atomically
from workbench.errors import InputError, Problem, quoted
from workbench.evidence.ratio.reading import profile, sheet, shown_values
from workbench.plots.page import KINDS, picture_bytes
from workbench.plots.scan_page import scan_page
from workbench.records.outcomes import ScanOutcome

if TYPE_CHECKING:
    from workbench.plots.page import Page

_POINTS = 801
_MOST_PARAMETERS = 2


def refuse_other_kinds(option: str, name: str) -> None:
    """Refuse a picture's file whose ending is not known, before anything is computed.

    Args:
        option: the option that named it.
        name: the file.

    Raises:
        InputError: if the ending is not known or the file can't be written.
    """
    if _kind(name) not in KINDS:
        endings = ", ".join(f".{kind}" for kind in KINDS)
        remedy = f"{option} {Path(name).stem or 'odds'}.png"
        raise InputError(
            Problem("A kind of picture that is not drawn", option, quoted(name), endings, remedy)
        )
    refuse_unwritable(option, name)


def save_figure(figure: Page, name: str) -> None:
    """Draw a figure into a file, whole or not at all.

    Args:
        figure: what is drawn.
        name: the file; its ending says the kind.

    Raises:
        InputError: if it can't be written.
    """
    write_bytes_atomically(Path(name), picture_bytes(figure, _kind(name)))


def save_scan(outcome: ScanOutcome, name: str) -> None:
    """Draw an updating ratio into a file, whole or not at all.

    Args:
        outcome: what `scan` found.
        name: the file.

    Raises:
        InputError: if it can't be written, R is known nowhere, or there are more than two parameters.
    """
    found = outcome.found
    if len(found.over) > _MOST_PARAMETERS:
        raise InputError(
            Problem(
                "A picture of more than two parameters",
                "--picture",
                ", ".join(quoted(one) for one in found.over),
                "one or two parameters",
                "name them with --over: the others are averaged over their stated priors",
            )
        )
    read = (
        sheet(found) if len(found.over) == _MOST_PARAMETERS else profile(found, shown_values(found, _POINTS))
    )
    save_figure(scan_page(found, read), name)


def _kind(name: str) -> str:
    return Path(name).suffix.lower().removeprefix(".")
