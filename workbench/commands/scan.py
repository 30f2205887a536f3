"""`oddsbench scan`: the updating ratio along signal parameters."""

from __future__ import annotations

import argparse
from dataclasses import replace

from workbench.commands.delivery import add_delivery_options, deliver
from workbench.commands.inputs import add_histogram_options, add_seed_option, load, refuse_planning
from workbench.commands.outputs import refuse_undeliverable
from workbench.commands.parsing import Parser
from workbench.commands.terminal import Progress
from workbench.evidence.updating_ratio import scan
from workbench.records.outcomes import ScanOutcome
from workbench.records.scan_record import scan_record
from workbench.records.screens.scan import scan_screen


def add_options(parser: Parser) -> None:
    """Give the command its options."""
    parser.add_argument(
        "--over",
        metavar="PARAMETER",
        action="append",
        help="a signal parameter; again for another (default all, the others are averaged over their priors)",
    )
    parser.add_argument(
        "--hypothesis", metavar="NAME", help="the hypothesis with the signal (default the first that fits)"
    )
    add_delivery_options(parser)
    add_seed_option(parser)
    add_histogram_options(parser)
    parser.add_argument(
        "--picture", metavar="FILE", help="draw one or two parameters into a .png, .svg or .pdf"
    )


def run(options: argparse.Namespace) -> int:
    """Scan and return the exit code: 0, or 1 when the updating ratio is not established."""
    refuse_undeliverable(options)
    outcome = _scanned(options)
    if options.picture is not None:
        from workbench.commands.pictures import save_scan

        save_scan(outcome, options.picture)
    deliver(options, lambda: scan_screen(outcome), lambda: scan_record(outcome), outcome.analysis.cautions)
    return 0 if outcome.found.established else 1


def _scanned(options: argparse.Namespace) -> ScanOutcome:
    analysis, origin = load(options, seed=options.seed)
    refuse_planning(analysis, "scan")
    with Progress() as progress:
        progress.say("scanning")
        found = scan(analysis, options.over, hypothesis=options.hypothesis, seed=options.seed)
    asked = {**origin.options, "over": ", ".join(found.over), "hypothesis": found.hypothesis}
    return ScanOutcome(analysis, replace(origin, options=asked), found)
