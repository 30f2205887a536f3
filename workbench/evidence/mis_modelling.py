"""What to say when a smooth distortion of the backgrounds wins, or keeps a good share of the probability."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from workbench.errors import Caution, quoted
from workbench.evidence.results import Posterior
from workbench.hypotheses.analysis import Analysis

GOOD_SHARE = 0.1


def mis_modelling_cautions(analysis: Analysis, posteriors: Sequence[Posterior]) -> Iterator[Caution]:
    """Yield a caution for each hypothesis of distorted backgrounds alone that can't be left aside.

    Args:
        analysis: everything declared.
        posteriors: one a hypothesis, in file order.

    Yields:
        Cautions; none where the probabilities are not established.

    Source:
        None; that a share of a tenth is worth a sentence is a choice.
    """
    known = {one.hypothesis: one.probability for one in posteriors if one.probability is not None}
    if len(known) < len(posteriors):
        return
    for hypothesis in analysis.hypotheses:
        processes = analysis.processes_of(hypothesis.name)
        is_neither = hypothesis.distortion is not None and not any(one.is_signal for one in processes)
        if is_neither and known[hypothesis.name] >= GOOD_SHARE:
            yield _caution(hypothesis.name, known)


def _caution(name: str, known: dict[str, float]) -> Caution:
    share = known[name]
    if share >= max(known.values()):
        return Caution(
            "distortion-wins",
            f"{quoted(name)} is the most probable hypothesis ({share:.2g}): a smooth distortion of the "
            "backgrounds describes these counts better than anything else here. Take it for mis-modelling, "
            "and mend the backgrounds or their uncertainties before reading odds for a signal.",
        )
    return Caution(
        "distortion-shares",
        f"{quoted(name)} keeps {share:.2g} of the probability: part of what speaks for another hypothesis "
        "may be a background that is smoothly wrong. Read that hypothesis' probability, not its odds "
        "against the first alone.",
    )
