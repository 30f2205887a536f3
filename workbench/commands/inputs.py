"""FILE read: an analysis, or a bare histogram that is made into one."""

from __future__ import annotations

import argparse
from pathlib import Path

from workbench.commands.delivery import refuse_unwritable
from workbench.commands.parsing import Parser, relative_size, whole_number
from workbench.counts.files import digest_of, read_bytes
from workbench.errors import InputError, Problem, quoted
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.file.kinds import (
    ANALYSES,
    HISTOGRAMS,
    existing_file_problem,
    unknown_kind_problem,
)
from workbench.records.numbers import as_written
from workbench.records.outcomes import Origin

DEFAULT_SEED = 1
DEFAULT_BACKGROUND_UNCERTAINTY = 0.10
EXAMPLE_PRIOR = "{ uniform = { low = 0, high = 5 } }"


def add_histogram_options(parser: Parser) -> None:
    """Give a command the options that make a bare histogram an analysis."""
    group = parser.add_argument_group("for a histogram without an analysis file")
    group.add_argument(
        "--strength", metavar="PRIOR", help=f"prior of the signal strength (default {EXAMPLE_PRIOR})"
    )
    group.add_argument(
        "--background-uncertainty",
        metavar="X",
        type=relative_size("--background-uncertainty"),
        help=f"relative uncertainty of each background (default {DEFAULT_BACKGROUND_UNCERTAINTY})",
    )
    group.add_argument("--save", metavar="FILE", help="write the analysis file that was made")


def add_seed_option(parser: Parser) -> None:
    """Give a command its --seed."""
    parser.add_argument(
        "--seed",
        metavar="N",
        type=whole_number("--seed", 0, 2**63 - 1),
        default=DEFAULT_SEED,
        help=f"seed of every random number (default {DEFAULT_SEED})",
    )


def add_pseudo_experiments_option(parser: Parser) -> None:
    """Give a command its --pseudo-experiments."""
    parser.add_argument(
        "--pseudo-experiments",
        metavar="N",
        type=whole_number("--pseudo-experiments", 200, 10_000_000),
        default=2000,
        help="at most so many for each hypothesis' adequacy (default 2000)",
    )


def load(options: argparse.Namespace, *, seed: int | None) -> tuple[Analysis, Origin]:
    """Return the analysis that FILE holds or makes, and where it came from.

    Args:
        options: with `file`, and perhaps `strength`, `background_uncertainty` and `save`.
        seed: the seed in force; None where nothing is drawn.

    Raises:
        InputError: with everything that is wrong with the input.
    """
    name = options.file.encode("utf-8", "backslashreplace").decode()
    suffix = Path(options.file).suffix.lower()
    if suffix in ANALYSES:
        _refuse_histogram_options(options)
        from workbench.hypotheses.file.reading import read_analysis

        analysis = read_analysis(options.file)
        return analysis, Origin(name, digest_of(read_bytes(Path(options.file), name)), seed)
    if suffix in HISTOGRAMS:
        return _from_histogram(options, name, seed)
    if not Path(options.file).is_file():
        read_bytes(Path(options.file), name)  # says what is there instead
    raise InputError(unknown_kind_problem(options.file, name))


def refuse_planning(analysis: Analysis, command: str) -> None:
    """Refuse an analysis without observed counts, for commands that need them.

    Args:
        analysis: the analysis.
        command: the command that needs them.

    Raises:
        InputError: naming every region without them.
    """
    missing = [region for region in analysis.regions if region.table.observed is None]
    if missing:
        raise InputError(
            *(
                Problem(
                    f"{command} needs observed counts",
                    f"region {quoted(region.name)}, {region.table.source}",
                    'no column "observed"',
                    'a column "observed" with the counted events',
                    "add the column; oddsbench check works without it",
                )
                for region in missing
            )
        )


def _from_histogram(options: argparse.Namespace, name: str, seed: int | None) -> tuple[Analysis, Origin]:
    from workbench.counts.csv_table import read_csv_table
    from workbench.hypotheses.bare import DEFAULT_STRENGTH, analysis_from_table, parse_prior

    _refuse_existing(options.save)
    strength = DEFAULT_STRENGTH if options.strength is None else parse_prior(options.strength)
    given = options.background_uncertainty
    size = DEFAULT_BACKGROUND_UNCERTAINTY if given is None else given
    table = read_csv_table(Path(options.file), name)
    analysis = analysis_from_table(table, strength=strength, background_uncertainty=size)
    made_up = (
        f"No analysis file: the signal columns are one process, its strength's prior is {strength.text()}; "
        f"every background has its own uncertainty of {as_written(100.0 * size)} %. Change these with "
        "--strength and --background-uncertainty."
    )
    notes = [made_up]
    if options.save is None:
        notes.append("Add --save FILE.toml to keep the analysis file that this made.")
    else:
        from workbench.hypotheses.file.writing import write_analysis

        write_analysis(analysis, Path(options.save))
        notes.append(f"The analysis file that this made is {options.save}.")
    made = {"strength": options.strength or EXAMPLE_PRIOR, "background_uncertainty": size}
    return analysis, Origin(name, analysis.digest, seed, made, tuple(notes))


def _refuse_existing(save: str | None) -> None:
    refuse_unwritable("--save", save)
    if save is not None and Path(save).exists():
        raise InputError(existing_file_problem("--save", save))


def _refuse_histogram_options(options: argparse.Namespace) -> None:
    given = [
        ("--strength", getattr(options, "strength", None)),
        ("--background-uncertainty", getattr(options, "background_uncertainty", None)),
        ("--save", getattr(options, "save", None)),
    ]
    problems = [
        Problem(
            f"{option} does not go with an analysis file",
            option,
            quoted(str(value)),
            "a histogram file (.csv, .tsv, .txt)",
            f"say it in {options.file}, and leave {option} out",
        )
        for option, value in given
        if value is not None
    ]
    if problems:
        raise InputError(*problems)
