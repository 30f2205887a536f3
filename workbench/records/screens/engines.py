"""Which engine made a number where it was not the standard one, and why."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from workbench.evidence.results import Evidence
from workbench.records.screens.layout import bullet, named, one_line

_WORDS = {"annealed": "annealed populations", "nested": "nested sampling"}


def engine_lines(evidences: Sequence[Evidence]) -> list[str]:
    """Return a point for each engine and reason; none where the standard engine made every number.

    Args:
        evidences: one a hypothesis.
    """
    found: dict[str, list[str]] = {}
    for name, evidence in _all(evidences):
        if evidence.engine in _WORDS:
            why = f"since {evidence.engine_reason}" if evidence.engine_reason else "as asked for"
            found.setdefault(f"by {_WORDS[evidence.engine]}, {why}.", []).append(name)
    lines: list[str] = []
    for words, names in found.items():
        lines += bullet(f"{' and '.join(names)} {words}")
    return lines


def _all(evidences: Sequence[Evidence]) -> Iterator[tuple[str, Evidence]]:
    for evidence in evidences:
        yield named(evidence.hypothesis), evidence
        for one in evidence.alternatives:
            yield f"{named(evidence.hypothesis)} with {one_line(one.name)}", one.evidence
