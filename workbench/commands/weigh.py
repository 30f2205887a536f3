"""`oddsbench weigh`: evidences, Bayes factors and posterior odds."""

from __future__ import annotations

import argparse
from dataclasses import replace

from workbench.commands.delivery import add_delivery_options, deliver
from workbench.commands.inputs import (
    add_histogram_options,
    add_pseudo_experiments_option,
    add_seed_option,
    load,
    refuse_planning,
)
from workbench.commands.judging import fits_and_adequacies
from workbench.commands.outputs import refuse_undeliverable
from workbench.commands.parsing import Parser, one_of
from workbench.commands.reprior import add_reprior_options, read_again, refuse_priors_alone
from workbench.commands.terminal import Progress
from workbench.evidence.engines import AUTO, ENGINES
from workbench.evidence.weigh import weigh
from workbench.records.outcomes import WeighOutcome
from workbench.records.screens.weigh import weigh_screen
from workbench.records.weigh_record import weigh_record


def add_options(parser: Parser) -> None:
    """Give the command its options."""
    add_delivery_options(parser)
    add_seed_option(parser)
    add_pseudo_experiments_option(parser)
    add_histogram_options(parser)
    add_reprior_options(parser)
    parser.add_argument("--picture", metavar="FILE", help="draw odds and counts into a .png, .svg or .pdf")
    parser.add_argument(
        "--engine",
        metavar="NAME",
        type=one_of("--engine", ENGINES),
        help=f"what makes the evidences: {', '.join(ENGINES)} (default {AUTO}: standard, and annealed where "
        "that establishes nothing)",
    )


def run(options: argparse.Namespace) -> int:
    """Weigh the hypotheses and return the exit code: 0, or 1 when an evidence is not established."""
    if options.reprior is not None:
        return read_again(options)
    refuse_priors_alone(options)
    refuse_undeliverable(options)
    outcome = _weighed(options)
    if options.picture is not None:
        from workbench.commands.pictures import save_figure
        from workbench.plots.page import weighing_page

        save_figure(weighing_page(outcome), options.picture)
    deliver(options, lambda: weigh_screen(outcome), lambda: weigh_record(outcome), outcome.cautions)
    return 0 if outcome.weighing.established else 1


def _weighed(options: argparse.Namespace) -> WeighOutcome:
    analysis, origin = load(options, seed=options.seed)
    refuse_planning(analysis, "weigh")
    most, engine = options.pseudo_experiments, options.engine or AUTO
    with Progress() as progress:
        progress.say("weighing")
        weighing = weigh(analysis, seed=options.seed, engine=engine)
        fits, adequacies = fits_and_adequacies(
            analysis, weighing, seed=options.seed, most=most, progress=progress
        )
    asked = {**origin.options, "pseudo_experiments": most, "engine": engine}
    return WeighOutcome(analysis, replace(origin, options=asked), weighing, adequacies, fits)
