"""The engine's answers held against the references: pulls, and what they add up to."""

from __future__ import annotations

import time
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from tests.evidence.references.cases import case
from tests.evidence.references.saved import Saved
from workbench.evidence.weigh import weigh

ALL = "all"


@dataclass(frozen=True)
class Answer:
    """What the engine said about one case.

    Attributes:
        number, kind: the case.
        pulls: of ln B first, then of each ln evidence: difference over combined errors; empty where one is
            missing.
        established: whether all that it takes is called established.
        stated, reference: the error of ln B, the engine's and the reference's [nats].
        seconds: how long the engine took.
        k_hats: Pareto shapes of the largest weights, one an evidence that was sampled.
        reasons: why an evidence is not established.
    """

    number: int
    kind: str
    pulls: tuple[float, ...]
    established: bool
    stated: float
    reference: float
    seconds: float
    k_hats: tuple[float, ...] = ()
    reasons: tuple[str, ...] = ()


def answered(number: int, rows: Mapping[tuple[int, str], Saved], seed: int = 1) -> Answer:
    """Return the engine's answer for one case beside its reference.

    The engine's seed is the given one plus the case's number: with one seed for all, draws in as many
    dimensions would err alike, and pulls would not be independent.
    """
    one = case(number)
    started = time.perf_counter()
    weighing = weigh(one.analysis, seed=seed + number)
    seconds = time.perf_counter() - started
    truth = [rows[number, evidence.hypothesis] for evidence in weighing.evidences]
    estimates = [estimate for evidence in weighing.evidences for estimate in evidence.estimates]
    k_hats = tuple(estimate.k_hat for estimate in estimates if estimate.k_hat is not None)
    reasons = tuple(evidence.reason for evidence in weighing.evidences if evidence.reason)
    found = [(evidence.ln_evidence, evidence.error) for evidence in weighing.evidences]
    known = [(value, error) for value, error in found if value is not None and error is not None]
    if len(known) < len(found):
        return Answer(number, one.kind, (), False, np.inf, 0.0, seconds, k_hats, reasons)
    values, errors = np.array([value for value, _ in known]), np.array([error for _, error in known])
    right, spread = np.array([row.ln_evidence for row in truth]), np.array([row.error for row in truth])
    stated, reference = float(np.hypot.reduce(errors[[0, -1]])), float(np.hypot.reduce(spread[[0, -1]]))
    gap = float((values[-1] - values[0]) - (right[-1] - right[0]))
    each = (values - right) / np.hypot(errors, spread)
    pulls = (gap / float(np.hypot(stated, reference)), *each.tolist())
    return Answer(number, one.kind, pulls, not reasons, stated, reference, seconds, k_hats, reasons)


def tallies(answers: Sequence[Answer]) -> list[str]:
    """Return the lines of the table of pulls: how many of what is established lie inside 2 and outside 4."""
    columns = (
        "cases",
        "established",
        "inside 2",
        "outside 4",
        "spread",
        "ln Z inside 2",
        "outside 4",
        "s/case",
    )
    lines = [f"{'':19s}" + "".join(f"{column:>{len(column) + 2}s}" for column in columns)]
    for kind in (*dict.fromkeys(one.kind for one in answers), ALL):
        those = [one for one in answers if kind in {one.kind, ALL}]
        sizes = (len(column) + 2 for column in columns)
        lines.append(
            f"{kind:19s}" + "".join(f"{n:>{size}s}" for n, size in zip(_counted(those), sizes, strict=True))
        )
    return lines


def _counted(those: Sequence[Answer]) -> tuple[str, ...]:
    """Return the numbers of one line, as text."""
    established = [one for one in those if one.established]
    of_ratio = np.abs([one.pulls[0] for one in established])
    of_each = np.abs([pull for one in established for pull in one.pulls[1:]])
    spread = float(np.sqrt(np.mean(np.minimum(of_ratio, 10.0) ** 2))) if established else 0.0
    return (
        str(len(those)),
        str(len(established)),
        str(int((of_ratio <= 2.0).sum())),
        str(int((of_ratio > 4.0).sum())),
        f"{spread:.2f}",
        f"{int((of_each <= 2.0).sum())} of {of_each.size}",
        str(int((of_each > 4.0).sum())),
        f"{np.mean([one.seconds for one in those]):.2f}",
    )


def told(one: Answer) -> str:
    """Return a case in a line."""
    pulls = " ".join(f"{pull:+.2f}" for pull in one.pulls) or "none"
    state = "" if one.established else "; not established: " + "; ".join(one.reasons)
    is_coarse = one.reference > one.stated / 3.0 > 0.0
    coarse = f"; the reference's {one.reference:.2g} is above a third" if is_coarse else ""
    k_hats = " ".join(f"{k_hat:.2f}" for k_hat in one.k_hats) or "none"
    numbers = f"pulls {pulls}, stated {one.stated:.2g}{coarse}, k-hat {k_hats}, {one.seconds:.1f} s"
    return f"{one.number:3d} {one.kind}: {numbers}{state}"
