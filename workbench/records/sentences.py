"""Sentences that every place where a result is read says in the same words."""

from __future__ import annotations

import math
from collections.abc import Sequence

from workbench.ensembles.results import Adequacy
from workbench.errors import Caution, quoted
from workbench.evidence.breaking.results import Breaking, BreakPoint
from workbench.evidence.ratio.results import Scan
from workbench.evidence.results import Comparison
from workbench.hypotheses.analysis import Analysis, Parameter
from workbench.likelihood.coordinates import coordinates_of
from workbench.records.numbers import as_written, trimmed, with_error

FAILS_BELOW = 0.01


def verdict_on_all(adequacies: Sequence[Adequacy]) -> str:
    """Return the sentence for when no hypothesis describes the data; empty otherwise."""
    if not adequacies or not all(adequacy.fails for adequacy in adequacies):
        return ""
    if len(adequacies) == 2:
        return "neither hypothesis describes the data"
    return "no hypothesis describes the data"


def adequacy_number(adequacy: Adequacy) -> str:
    """Return "p = 0.41 ± 0.03"."""
    return f"p = {with_error(adequacy.p, adequacy.p_error)}"


def adequacy_verdict(adequacy: Adequacy) -> str:
    """Return whether a hypothesis describes the data, and what that rests on."""
    verdict = "DOES NOT DESCRIBE THE DATA" if adequacy.fails else "describes the data"
    return f"{verdict} ({adequacy.pseudo_experiments:,} pseudo-experiments)"


def ln_posterior_odds(comparison: Comparison) -> float | None:
    """Return ln of the posterior odds, which stays a number where the odds themselves overflow.

        ln(posterior odds) = ln B + ln(prior odds)

    Args:
        comparison: one hypothesis against the first.

    Returns:
        The ln odds [nats]; None where they are not established.

    Source:
        None, definition.
    """
    if not comparison.established or comparison.ln_bayes_factor is None:
        return None
    return comparison.ln_bayes_factor + math.log(comparison.prior_odds)


def threshold_text(found: BreakPoint) -> str:
    """Return the threshold of a break point as text: 3, or ln 20 to four decimals."""
    return as_written(round(found.below, 4))


def break_point_words(found: BreakPoint) -> str:
    """Return the answer of a break point in one sentence.

    Args:
        found: the break point of two established evidences.
    """
    goal = f"bring ln B down to {threshold_text(found)}"
    if found.ending is Breaking.BELOW_ALREADY:
        return f"ln B is not above {threshold_text(found)} to begin with: there is nothing to break."
    if found.under_peak is None:
        return (
            f"No smooth distortion of {found.terms} terms within {as_written(100.0 * found.within)} % "
            f"(rms over the background) is enough to {goal}."
        )
    side = "too low" if found.under_peak > 0.0 else "too high"
    return (
        f"Backgrounds that are declared {side} by {trimmed(100.0 * abs(found.under_peak), 2)} % under the "
        f"peak, and smoothly wrong elsewhere, are enough to {goal}."
    )


def usual_cautions(analysis: Analysis, comparisons: Sequence[Comparison]) -> tuple[Caution, ...]:
    """Return what holds for every claim that rests on odds, worded for this analysis.

    Args:
        analysis: the analysis.
        comparisons: its comparisons.
    """
    strengths = {
        coordinate.name
        for comparison in comparisons
        for coordinate in coordinates_of(analysis, comparison.hypothesis)
        if coordinate.is_strength
    }
    cautions = [
        Caution(
            "conditional",
            "The odds are between the hypotheses listed here, under the priors stated here. What is not "
            "listed, another background or a fault of the instrument, has no share in them.",
        ),
        Caution(
            "numerical",
            "Every ± on an evidence, a Bayes factor or odds is numerical only; how far the answer depends "
            "on the priors is said beside it.",
        ),
    ]
    if strengths:
        names = " and ".join(quoted(name) for name in sorted(strengths))
        cautions.append(
            Caution(
                "strength-prior",
                f"The Bayes factor depends on how wide the prior of {names} is: "
                "defend that width from what was known before the data.",
            )
        )
    cautions.append(_look_elsewhere(analysis, comparisons, strengths))
    cautions.append(
        Caution(
            "review",
            "Odds are one input to a claim of discovery; the decision belongs to the collaboration's own "
            "review.",
        )
    )
    return tuple(cautions)


def _look_elsewhere(analysis: Analysis, comparisons: Sequence[Comparison], strengths: set[str]) -> Caution:
    searched: dict[str, str] = {}
    for comparison in comparisons:
        held = analysis.hypothesis(comparison.hypothesis).fix
        for name in analysis.signal_parameters(comparison.hypothesis):
            if name not in strengths and name not in held:
                parameter = analysis.parameter(name)
                searched[name] = f"{quoted(name)} ({prior_words(parameter)})"
    if searched:
        return Caution(
            "look-elsewhere",
            f"The range that was searched is inside the prior of {' and '.join(searched.values())}, so the "
            "odds pay for it already; a range chosen after looking is not paid for.",
        )
    return Caution(
        "look-elsewhere",
        "The place of the signal is taken as known beforehand; if these data suggested it, the odds are too "
        "high.",
    )


def scan_cautions(found: Scan) -> tuple[Caution, ...]:
    """Return what holds for every updating ratio, worded for this one.

    Args:
        found: the scan.
    """
    peak = Caution(
        "peak",
        "R at its peak is no Bayes factor: that place was chosen by these counts. A Bayes factor is the "
        "average of R over a prior stated before looking.",
    )
    return (peak, *_ratio_cautions(found))


def reading_cautions(found: Scan) -> tuple[Caution, ...]:
    """Return what holds for a Bayes factor under priors that a reader brings.

    Args:
        found: the scan that they are applied to.
    """
    chosen = Caution(
        "chosen-prior",
        "A prior narrowed onto the peak of R after seeing it gives odds that are too high: bring one that "
        "was defended before looking at these counts.",
    )
    return (chosen, *_ratio_cautions(found))


def _ratio_cautions(found: Scan) -> tuple[Caution, ...]:
    cautions = []
    if found.averaged:
        names = " and ".join(f"{quoted(name)} ({prior.text()})" for name, prior in found.averaged.items())
        cautions.append(
            Caution(
                "averaged",
                f"R holds under the stated prior of {names}, which it is averaged over. Only over all signal "
                "parameters is it free of their priors.",
            )
        )
    cautions += [
        Caution(
            "nuisance-priors",
            "Priors of nuisance parameters, uncertainties included, are part of R and stay as stated.",
        ),
        Caution("numerical", "Every ± is numerical only."),
        Caution(
            "review",
            "Odds are one input to a claim of discovery; the decision belongs to the collaboration's own "
            "review.",
        ),
    ]
    return tuple(cautions)


def prior_words(parameter: Parameter) -> str:
    """Return a parameter's prior in words, with its unit."""
    text = parameter.prior.text()
    return f"{text}, in {parameter.unit}" if parameter.unit else text
