"""`oddsbench breakpoint`: the smallest smooth distortion of the background that takes the evidence away."""

from __future__ import annotations

import argparse
import math
from dataclasses import replace

from workbench.commands.delivery import add_delivery_options, deliver
from workbench.commands.inputs import add_histogram_options, add_seed_option, load, refuse_planning
from workbench.commands.outputs import refuse_undeliverable
from workbench.commands.parsing import Parser, number, relative_size, whole_number
from workbench.commands.terminal import Progress
from workbench.errors import InputError, Problem
from workbench.evidence.breaking.break_point import DEFAULT_BELOW, DEFAULT_WITHIN, break_point
from workbench.evidence.breaking.question import signal_hypothesis
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.distortion import DEFAULT_TERMS, MOST_TERMS
from workbench.records.breakpoint_record import breakpoint_record
from workbench.records.outcomes import BreakPointOutcome
from workbench.records.screens.breakpoint import breakpoint_screen


def add_options(parser: Parser) -> None:
    """Give the command its options."""
    add_delivery_options(parser)
    add_seed_option(parser)
    add_histogram_options(parser)
    parser.add_argument(
        "--below",
        metavar="LN_B",
        type=number("--below"),
        help=f"the threshold that ln B is brought down to (default {DEFAULT_BELOW:g})",
    )
    parser.add_argument(
        "--odds",
        metavar="X",
        type=number("--odds"),
        help="the same as posterior odds X : 1, prior odds as in the file",
    )
    parser.add_argument("--hypothesis", metavar="NAME", help="the signal hypothesis (default the first)")
    parser.add_argument(
        "--terms",
        metavar="N",
        type=whole_number("--terms", 1, MOST_TERMS),
        help=f"smooth terms in each region (default those that the file declares, or {DEFAULT_TERMS})",
    )
    parser.add_argument(
        "--region", metavar="NAME", action="append", help="distort this region only; may be given again"
    )
    parser.add_argument(
        "--within",
        metavar="X",
        type=relative_size("--within"),
        default=DEFAULT_WITHIN,
        help=f"the largest distortion looked at, 0.10 is ten per cent (default {DEFAULT_WITHIN:g})",
    )
    parser.add_argument("--picture", metavar="FILE", help="draw the distortion into a .png, .svg or .pdf")


def run(options: argparse.Namespace) -> int:
    """Find the break point and return the exit code: 0, or 1 when there is no established answer."""
    refuse_undeliverable(options)
    outcome = _found(options)
    if options.picture is not None:
        from workbench.commands.pictures import save_figure
        from workbench.plots.page import break_point_page

        save_figure(break_point_page(outcome), options.picture)
    cautions = outcome.analysis.cautions
    deliver(options, lambda: breakpoint_screen(outcome), lambda: breakpoint_record(outcome), cautions)
    return 0 if outcome.found.ending.is_answer else 1


def _found(options: argparse.Namespace) -> BreakPointOutcome:
    analysis, origin = load(options, seed=options.seed)
    refuse_planning(analysis, "breakpoint")
    below = _threshold(options, analysis)
    with Progress() as progress:
        progress.say("distorting the backgrounds")
        found = break_point(
            analysis,
            below=below,
            hypothesis=options.hypothesis,
            terms=options.terms,
            regions=options.region,
            within=options.within,
            seed=options.seed,
        )
    asked = {
        **origin.options,
        "below": below,
        "hypothesis": found.hypothesis,
        "terms": options.terms,
        "regions": ", ".join(options.region) if options.region else None,
        "within": options.within,
    }
    return BreakPointOutcome(analysis, replace(origin, options=asked), found)


def _threshold(options: argparse.Namespace, analysis: Analysis) -> float:
    """Return the threshold on ln B, whichever way it was said."""
    if options.odds is None:
        return DEFAULT_BELOW if options.below is None else float(options.below)
    if options.below is not None:
        raise InputError(
            Problem(
                "Two thresholds where one is needed",
                "--below and --odds",
                f"{options.below:g} and {options.odds:g}",
                "ln B, or posterior odds",
                "leave one of them out",
            )
        )
    if not options.odds > 0.0:
        raise InputError(
            Problem("Odds that are not above 0", "--odds", f"{options.odds:g}", "a number > 0", "--odds 20")
        )
    name = options.hypothesis or signal_hypothesis(analysis)
    prior_odds = analysis.hypothesis(name).prior / analysis.hypotheses[0].prior
    return math.log(options.odds) - math.log(prior_odds)
