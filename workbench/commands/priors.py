"""`oddsbench priors`: what the choice of priors does to the Bayes factor."""

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
from workbench.commands.outputs import refuse_undeliverable
from workbench.commands.parsing import Parser, probability_between
from workbench.commands.terminal import Progress
from workbench.ensembles.adequacy import adequacy
from workbench.evidence.prior_choice.sensitivity import POSTERIOR, prior_sensitivity
from workbench.records.outcomes import PriorsOutcome
from workbench.records.priors_record import priors_record
from workbench.records.screens.priors import priors_screen


def add_options(parser: Parser) -> None:
    """Give the command its options."""
    add_delivery_options(parser)
    add_seed_option(parser)
    add_pseudo_experiments_option(parser)
    parser.add_argument(
        "--hypothesis", metavar="NAME", help="the hypothesis (default: the first with a strength)"
    )
    parser.add_argument("--parameter", metavar="NAME", help="its strength (default: the first)")
    parser.add_argument(
        "--posterior",
        metavar="P",
        type=probability_between("--posterior"),
        default=POSTERIOR,
        help=f"posterior probability that is wanted (default {POSTERIOR})",
    )
    add_histogram_options(parser)
    parser.add_argument(
        "--picture", metavar="FILE", help="draw the maps of verdicts into a .png, .svg or .pdf"
    )


def run(options: argparse.Namespace) -> int:
    """Examine the priors and return the exit code: 0, or 1 when the Bayes factor is not established."""
    refuse_undeliverable(options)
    outcome = _examined(options)
    if options.picture is not None:
        from workbench.commands.pictures import save_figure
        from workbench.plots.priors_page import priors_page

        save_figure(priors_page(outcome), options.picture)
    deliver(options, lambda: priors_screen(outcome), lambda: priors_record(outcome), outcome.cautions)
    return 0 if outcome.found.established else 1


def _examined(options: argparse.Namespace) -> PriorsOutcome:
    analysis, origin = load(options, seed=options.seed)
    refuse_planning(analysis, "priors")
    most = options.pseudo_experiments
    with Progress() as progress:
        found = prior_sensitivity(
            analysis,
            hypothesis=options.hypothesis,
            parameter=options.parameter,
            posterior=options.posterior,
            seed=options.seed,
            say=progress.say,
        )
        adequacies = []
        for name in (found.comparison.against, found.comparison.hypothesis):
            progress.say(f"pseudo-experiments of {name}")
            adequacies.append(adequacy(analysis, name, seed=options.seed, most=most))
    asked = {
        **origin.options,
        "hypothesis": options.hypothesis,
        "parameter": options.parameter,
        "posterior": options.posterior,
        "pseudo_experiments": most,
    }
    return PriorsOutcome(analysis, replace(origin, options=asked), found, tuple(adequacies))
