"""Results delivered: on standard output as text or JSON, and into a file where one is named."""

from __future__ import annotations

import argparse
import sys
from collections.abc import Callable, Iterable, Mapping
from pathlib import Path
from typing import Any

from workbench.commands.parsing import Parser
from workbench.commands.terminal import can_show, print_text, warn
from workbench.counts.files import write_text_atomically
from workbench.errors import Caution, InputError, Problem, quoted
from workbench.records.files import record_text, write_record


def add_delivery_options(parser: Parser) -> None:
    """Give a command its --json and --output."""
    parser.add_argument("--json", action="store_true", help="print the record as JSON instead of text")
    parser.add_argument(
        "--output",
        metavar="FILE",
        help="write the result to a file as well: JSON if it ends in .json, else text",
    )


def refuse_unwritable(option: str, name: str | None) -> None:
    """Refuse a file that can't be written before anything is computed.

    Args:
        option: the option that named it.
        name: the file; None where the option was not used.

    Raises:
        InputError: if its folder does not exist, or it is a folder itself.
    """
    if name is None:
        return
    path = Path(name)
    if path.is_dir():
        raise InputError(
            Problem("A folder where a file is needed", option, quoted(name), "a file", "add a file's name")
        )
    if not path.parent.is_dir():
        raise InputError(
            Problem(
                "File can't be written",
                option,
                quoted(name),
                "a folder that exists",
                f"make {quoted(str(path.parent))}",
            )
        )


def deliver(
    options: argparse.Namespace,
    text: Callable[[], str],
    record: Callable[[], Mapping[str, Any]],
    cautions: Iterable[Caution],
) -> None:
    """Write the output file, then standard output, then the warnings.

    Warnings are part of the text; standard error repeats them unless the text is on the terminal anyway.

    Args:
        options: with `json` and `output`.
        text: makes the screen.
        record: makes the record.
        cautions: what to warn of.

    Raises:
        InputError: if the file can't be written.
    """
    if options.output is not None:
        if options.output.lower().endswith(".json"):
            write_record(record(), options.output)
        else:
            write_text_atomically(Path(options.output), text())
    if options.json:
        made = record()
        shown = record_text(made)
        print_text(shown if can_show(shown, sys.stdout) else record_text(made, only_ascii=True), sys.stdout)
    else:
        print_text(text(), sys.stdout)
    if options.json or not sys.stdout.isatty():
        warn(cautions)
