"""`oddsbench backgrounds`: alternatives of the backgrounds, and the signal that each would fake."""

from __future__ import annotations

import argparse
from dataclasses import replace

from workbench.commands.delivery import add_delivery_options, deliver
from workbench.commands.inputs import add_histogram_options, add_seed_option, load
from workbench.commands.outputs import refuse_undeliverable
from workbench.commands.parsing import Parser
from workbench.commands.terminal import Progress
from workbench.evidence.backgrounds import backgrounds
from workbench.records.backgrounds_record import backgrounds_record
from workbench.records.outcomes import BackgroundsOutcome
from workbench.records.screens.backgrounds import backgrounds_screen


def add_options(parser: Parser) -> None:
    """Give the command its options."""
    add_delivery_options(parser)
    add_seed_option(parser)
    add_histogram_options(parser)
    parser.add_argument(
        "--hypothesis", metavar="NAME", help="the hypothesis with the signal (default the second)"
    )
    parser.add_argument("--picture", metavar="FILE", help="draw the alternatives into a .png, .svg or .pdf")


def run(options: argparse.Namespace) -> int:
    """Compare the backgrounds and return the exit code: 0, or 1 when an evidence is not established."""
    refuse_undeliverable(options)
    outcome = _compared(options)
    if options.picture is not None:
        from workbench.commands.pictures import save_figure
        from workbench.plots.page import backgrounds_page

        save_figure(backgrounds_page(outcome), options.picture)
    deliver(
        options, lambda: backgrounds_screen(outcome), lambda: backgrounds_record(outcome), outcome.cautions
    )
    return 0 if outcome.found.is_established else 1


def _compared(options: argparse.Namespace) -> BackgroundsOutcome:
    analysis, origin = load(options, seed=options.seed)
    with Progress() as progress:
        found = backgrounds(analysis, options.hypothesis, seed=options.seed, say=progress.say)
    asked = {**origin.options, "hypothesis": found.hypothesis}
    return BackgroundsOutcome(analysis, replace(origin, options=asked), found)
