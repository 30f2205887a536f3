"""What a weighing says of alternatives of the backgrounds: their evidences, probabilities, and ln B alone."""

from __future__ import annotations

from collections.abc import Sequence

from workbench.evidence.backgrounds import AVERAGE, Fake
from workbench.evidence.results import AlternativeEvidence, AlternativeFactor, Comparison, Evidence
from workbench.records.numbers import probability, with_errors
from workbench.records.screens.counted import NONE
from workbench.records.screens.layout import INDENT, aligned_at, columns, one_line, paragraph

Factor = Comparison | AlternativeFactor | Fake
_LONGEST = 18


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
    cells = factor_texts((*comparison.alternatives, comparison))
    rows = [["alternative", "prior", *(f"under {_short(name)}" for name in names), "ln B if it holds"]]
    for one, cell in zip(comparison.alternatives, cells, strict=False):
        chances = [posterior_words(evidence.get(one.name)) for evidence in found]
        rows.append([one_line(one.name), probability(one.prior, 1.0 - one.prior), *chances, cell])
    rows.append([AVERAGE, "", "", "", cells[-1]])
    title = "Alternatives of the backgrounds: prior and posterior probabilities, ln B alone"
    return ["", *paragraph(title), "", *columns(rows, "lrlll")]


def factor_texts(given: Sequence[Factor]) -> list[str]:
    """Return each ln B with its error, aligned; "not established" where it is not."""
    texts = ln_texts(
        [(one.ln_bayes_factor if one.established else None, one.ln_bayes_factor_error) for one in given]
    )
    return [text if one.established else "not established" for one, text in zip(given, texts, strict=True)]


def ln_texts(given: Sequence[tuple[float | None, float | None]]) -> list[str]:
    """Return logarithms with their errors, aligned; a dash where there is none."""
    known = [(value, error or 0.0) for value, error in given if value is not None]
    texts = iter(with_errors([value for value, _ in known], [error for _, error in known]))
    return aligned_at(" ±", [NONE if value is None else next(texts) for value, _ in given])


def posterior_words(one: AlternativeEvidence | None) -> str:
    """Return an alternative's posterior probability under a hypothesis."""
    if one is None or one.posterior is None:
        return NONE
    return probability(one.posterior, 1.0 - one.posterior, one.posterior_error)


def _short(name: str) -> str:
    """Return a hypothesis' name short enough to stand above a column."""
    line = one_line(name)
    return line if len(line) <= _LONGEST else line[: _LONGEST - 1].rstrip() + "…"
