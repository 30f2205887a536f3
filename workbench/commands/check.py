"""`oddsbench check`: what was understood, what the priors predict, whether anything fits; no odds."""

from __future__ import annotations

import argparse
from dataclasses import replace

from workbench.commands.delivery import add_delivery_options, deliver, refuse_unwritable
from workbench.commands.inputs import (
    add_histogram_options,
    add_pseudo_experiments_option,
    add_seed_option,
    load,
)
from workbench.commands.parsing import Parser
from workbench.commands.terminal import Progress
from workbench.ensembles.adequacy import adequacy
from workbench.ensembles.predictive import prior_predictive
from workbench.records.check_record import check_record
from workbench.records.outcomes import CheckOutcome
from workbench.records.screens.check import check_screen


def add_options(parser: Parser) -> None:
    """Give the command its options."""
    add_delivery_options(parser)
    add_seed_option(parser)
    add_pseudo_experiments_option(parser)
    add_histogram_options(parser)


def run(options: argparse.Namespace) -> int:
    """Check the input and return the exit code."""
    refuse_unwritable("--output", options.output)
    outcome = _checked(options)
    deliver(options, lambda: check_screen(outcome), lambda: check_record(outcome), outcome.analysis.cautions)
    return 0


def _checked(options: argparse.Namespace) -> CheckOutcome:
    analysis, origin = load(options, seed=options.seed)
    names = [hypothesis.name for hypothesis in analysis.hypotheses]
    most = options.pseudo_experiments
    is_observed = all(region.table.observed is not None for region in analysis.regions)
    with Progress() as progress:
        progress.say("drawing from the priors")
        predictives = tuple(prior_predictive(analysis, name, seed=options.seed) for name in names)
        adequacies = []
        for name in names if is_observed else []:
            progress.say(f"pseudo-experiments of {name}")
            adequacies.append(adequacy(analysis, name, seed=options.seed, most=most))
    asked = {**origin.options, "pseudo_experiments": most}
    return CheckOutcome(analysis, replace(origin, options=asked), predictives, tuple(adequacies))
