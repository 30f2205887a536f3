"""`oddsbench fit`: maximum likelihood of each hypothesis with errors, pulls and correlations."""

from __future__ import annotations

import argparse

from workbench.commands.delivery import add_delivery_options, deliver, refuse_unwritable
from workbench.commands.inputs import add_histogram_options, load, refuse_planning
from workbench.commands.parsing import Parser
from workbench.commands.terminal import Progress
from workbench.likelihood.fit import fit
from workbench.likelihood.results import Ending
from workbench.records.fit_record import fit_record
from workbench.records.outcomes import FitOutcome
from workbench.records.screens.fit import fit_screen

UNUSABLE = (Ending.NOT_CONVERGED, Ending.NO_SUPPORT)


def add_options(parser: Parser) -> None:
    """Give the command its options."""
    add_delivery_options(parser)
    add_histogram_options(parser)


def run(options: argparse.Namespace) -> int:
    """Fit every hypothesis and return the exit code: 0, or 1 when a fit gave nothing to use."""
    refuse_unwritable("--output", options.output)
    analysis, origin = load(options, seed=None)
    refuse_planning(analysis, "fit")
    fits = []
    with Progress() as progress:
        for hypothesis in analysis.hypotheses:
            progress.say(f"fitting {hypothesis.name}")
            fits.append(fit(analysis, hypothesis.name, asymmetric=True))
    outcome = FitOutcome(analysis, origin, tuple(fits))
    deliver(options, lambda: fit_screen(outcome), lambda: fit_record(outcome), analysis.cautions)
    return 1 if any(item.ending in UNUSABLE for item in fits) else 0
