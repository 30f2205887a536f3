"""`oddsbench weigh --reprior RECORD`: the reader's own priors on a saved updating ratio, with no new fit."""

from __future__ import annotations

import argparse

from workbench.commands.delivery import deliver, refuse_unwritable
from workbench.commands.parsing import Parser
from workbench.errors import InputError, Problem, quoted
from workbench.hypotheses.file.priors import parse_prior
from workbench.hypotheses.priors import Prior
from workbench.records.outcomes import ReadingOutcome
from workbench.records.reading_record import reading_record
from workbench.records.scan_reading import read_saved_scan
from workbench.records.screens.reading import reading_screen

EXAMPLE = "--prior 'mass={ uniform = { low = 30, high = 60 } }'"


def add_reprior_options(parser: Parser) -> None:
    """Give a command its --reprior and --prior."""
    group = parser.add_argument_group("for a saved updating ratio, instead of FILE")
    group.add_argument(
        "--reprior", metavar="RECORD", help="a record of oddsbench scan: other priors, nothing fitted again"
    )
    group.add_argument(
        "--prior",
        metavar="NAME=PRIOR",
        action="append",
        help="prior of a scanned parameter; again for another (default the one stated in RECORD)",
    )


def refuse_priors_alone(options: argparse.Namespace) -> None:
    """Refuse --prior where no record is named to apply it to.

    Raises:
        InputError: if there is one.
    """
    if options.prior is not None:
        raise InputError(
            Problem(
                "--prior without a saved updating ratio",
                "--prior",
                quoted(options.prior[0]),
                "--reprior RECORD beside it",
                f"make one with oddsbench scan {options.file} --output scan.json, or change the file's prior",
            )
        )


def read_again(options: argparse.Namespace) -> int:
    """Apply priors to a saved scan and return the exit code: 0, or 1 when it is not established."""
    _refuse_others(options)
    refuse_unwritable("--output", options.output)
    asked = priors_of(options.prior or [])
    saved = read_saved_scan(options.reprior)
    average = saved.scan.reprior(asked)
    outcome = ReadingOutcome(saved.name, saved.digest, saved.title, saved.file, saved.scan, asked, average)
    deliver(options, lambda: reading_screen(outcome), lambda: reading_record(outcome), ())
    return 0 if average.established else 1


def priors_of(given: list[str]) -> dict[str, Prior]:
    """Return parameter to prior of texts such as "mass={ uniform = { low = 30, high = 60 } }".

    Args:
        given: what followed each --prior.

    Raises:
        InputError: for a text that is none, and for a parameter given twice.
    """
    found: dict[str, Prior] = {}
    problems = []
    for text in given:
        name, mark, prior = (part.strip() for part in text.partition("="))
        name = name.strip('"')
        if not (mark and name):
            expected = "NAME=PRIOR, such as mass={ uniform = { low = 30, high = 60 } }"
            problems.append(
                Problem("A prior without its parameter", "--prior", quoted(text), expected, EXAMPLE)
            )
        elif name in found:
            problems.append(
                Problem("Two priors of one parameter", "--prior", quoted(name), "one", "leave one out")
            )
        else:
            try:
                found[name] = parse_prior(prior, f"--prior {name}")
            except InputError as error:
                problems += error.problems
    if problems:
        raise InputError(*problems)
    return found


def _refuse_others(options: argparse.Namespace) -> None:
    given = [
        ("FILE", options.file),
        ("--picture", options.picture),
        ("--engine", options.engine),
        ("--strength", options.strength),
        ("--background-uncertainty", options.background_uncertainty),
        ("--save", options.save),
    ]
    problems = [
        Problem(
            f"{option} does not go with --reprior",
            option,
            quoted(str(value)),
            "a record alone: nothing is read or fitted again",
            f"leave {option} out",
        )
        for option, value in given
        if value is not None
    ]
    if problems:
        raise InputError(*problems)
