"""`oddsbench ledger`: what carries the evidence, by bin, by region and by uncertainty."""

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
from workbench.commands.parsing import Parser, one_of, whole_number
from workbench.commands.terminal import Progress
from workbench.evidence.ledger.ledger import BY, LEAST_ORDERS, ORDERS, ledger
from workbench.records.ledger_record import ledger_record
from workbench.records.outcomes import LedgerOutcome
from workbench.records.screens.ledger import ledger_screen

ALL = "all"
MOST_ORDERS = 10_000


def add_options(parser: Parser) -> None:
    """Give the command its options."""
    add_delivery_options(parser)
    parser.add_argument(
        "--hypothesis",
        metavar="NAME",
        help="account for this hypothesis' Bayes factor only (default: all, each against the first)",
    )
    parser.add_argument(
        "--by",
        metavar="WHAT",
        type=one_of("--by", (*BY, ALL)),
        default=ALL,
        help=f"what to account for: {', '.join((*BY, ALL))} (default {ALL})",
    )
    parser.add_argument(
        "--orders",
        metavar="N",
        type=whole_number("--orders", LEAST_ORDERS, MOST_ORDERS),
        default=ORDERS,
        help=f"random orders of the bins, each followed forward and reversed (default {ORDERS})",
    )
    add_seed_option(parser)
    add_pseudo_experiments_option(parser)
    add_histogram_options(parser)
    parser.add_argument(
        "--picture", metavar="FILE", help="draw counts and their weights into a .png, .svg or .pdf"
    )


def run(options: argparse.Namespace) -> int:
    """Make the ledger and return the exit code: 0, or 1 when something of it is not established."""
    refuse_undeliverable(options)
    outcome = _accounted(options)
    if options.picture is not None:
        from workbench.commands.pictures import save_figure
        from workbench.plots.ledger_page import ledger_page

        save_figure(ledger_page(outcome), options.picture)
    deliver(options, lambda: ledger_screen(outcome), lambda: ledger_record(outcome), outcome.cautions)
    return 0 if outcome.ledger.established else 1


def _accounted(options: argparse.Namespace) -> LedgerOutcome:
    analysis, origin = load(options, seed=options.seed)
    refuse_planning(analysis, "ledger")
    by = BY if options.by == ALL else (options.by,)
    most = options.pseudo_experiments
    with Progress() as progress:
        progress.say("taking the evidence apart")
        found = ledger(
            analysis, hypothesis=options.hypothesis, by=by, orders=options.orders, seed=options.seed
        )
        fits, adequacies = fits_and_adequacies(
            analysis, found.weighing, seed=options.seed, most=most, progress=progress
        )
    asked = {
        **origin.options,
        "hypothesis": options.hypothesis,
        "by": options.by,
        "orders": options.orders,
        "pseudo_experiments": most,
    }
    return LedgerOutcome(analysis, replace(origin, options=asked), found, adequacies, fits)
