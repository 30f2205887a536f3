"""What stands beside every evidence: each hypothesis' fit, and whether it describes the data at all."""

from __future__ import annotations

from workbench.commands.terminal import Progress
from workbench.ensembles.adequacy import adequacy
from workbench.ensembles.results import Adequacy
from workbench.evidence.results import Weighing
from workbench.hypotheses.analysis import Analysis
from workbench.likelihood.fit import fit
from workbench.likelihood.results import Fit


def fits_and_adequacies(
    analysis: Analysis, weighing: Weighing, *, seed: int, most: int, progress: Progress
) -> tuple[tuple[Fit, ...], tuple[Adequacy, ...]]:
    """Return each hypothesis' fit and adequacy, in file order.

    Args:
        analysis: everything declared.
        weighing: its evidences, which say what alternative of a background is judged.
        seed: where the pseudo-experiments come from.
        most: at most so many pseudo-experiments for each adequacy.
        progress: where to say what is being done.
    """
    fits, adequacies = [], []
    for hypothesis in analysis.hypotheses:
        progress.say(f"fitting {hypothesis.name}")
        fits.append(fit(analysis, hypothesis.name, asymmetric=False))
        progress.say(f"pseudo-experiments of {hypothesis.name}")
        adequacies.append(adequacy(analysis, hypothesis.name, seed=seed, most=most, weighing=weighing))
    return tuple(fits), tuple(adequacies)
