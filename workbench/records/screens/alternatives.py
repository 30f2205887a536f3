"""What a weighing says of alternatives of the backgrounds: their evidences, probabilities, and ln B alone."""

from __future__ import annotations

from collections.abc import Sequence

from workbench.evidence.results import AlternativeEvidence, Comparison, Evidence
from workbench.records.numbers import probability, with_errors
from workbench.records.screens.counted import NONE
from workbench.records.screens.layout import INDENT, aligned_at, columns, one_line, paragraph

AVERAGE = "average"


def with_alternatives(evidences: Sequence[Evidence]) -> list[tuple[str, Evidence]]:
    """Return each evidence with its label, those of its alternatives indented below it.

    Args:
        evidences: one a hypothesis.
    """
    listed = []
    for evidence in evidences:
        listed.append((one_line(evidence.hypothesis), evidence))
        listed += [(f"{INDENT}with {one_line(one.name)}", one.evidence) for one in evidence.alternatives]
    return listed


def alternative_lines(comparison: Comparison, evidences: Sequence[Evidence]) -> list[str]:
    """Return each alternative's probabilities under two hypotheses, and ln B if it is known to hold.

    Args:
        comparison: one hypothesis against the first.
        evidences: one a hypothesis.

    Returns:
        Lines; none where no background is in doubt.
    """
    if not comparison.alternatives:
        return []
    names = (comparison.against, comparison.hypothesis)
    pair = [next(one for one in evidences if one.hypothesis == name) for name in names]
    found = [{one.name: one for one in evidence.alternatives} for evidence in pair]
    factors = [(one.ln_bayes_factor, one.ln_bayes_factor_error) for one in comparison.alternatives]
    factors.append((comparison.ln_bayes_factor, comparison.ln_bayes_factor_error))
    texts = iter(
        with_errors([a for a, _ in factors if a is not None], [e or 0.0 for a, e in factors if a is not None])
    )
    cells = aligned_at(" ±", [NONE if value is None else next(texts) for value, _ in factors])
    rows = [["alternative", "prior", *(f"under {one_line(name)}" for name in names), "ln B if it holds"]]
    for one, cell in zip(comparison.alternatives, cells, strict=False):
        chances = [posterior_words(evidence.get(one.name)) for evidence in found]
        mark = "" if one.established else ", not established"
        rows.append([one_line(one.name), probability(one.prior, 1.0 - one.prior), *chances, cell + mark])
    rows.append([AVERAGE, "", "", "", cells[-1]])
    title = "Alternatives of the backgrounds: prior and posterior probabilities, ln B alone"
    return ["", *paragraph(title), "", *columns(rows, "lrlll")]


def posterior_words(one: AlternativeEvidence | None) -> str:
    """Return an alternative's posterior probability under a hypothesis."""
    if one is None or one.posterior is None:
        return NONE
    return probability(one.posterior, 1.0 - one.posterior, one.posterior_error)
