"""The saved reference evidences: a table with the seed and the digest of the script that made it."""

from __future__ import annotations

import csv
import hashlib
import io
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, fields
from pathlib import Path

import numpy as np

from tests.evidence.references.cases import SEED
from tests.evidence.references.direct import Direct
from workbench.counts.files import write_text_atomically

HERE = Path(__file__).parent
TABLE = HERE / "references.csv"
# What a reference is made by; the analyses themselves are told by their fingerprints.
SCRIPT = ("quantiles", "spreads", "direct", "mixture", "population", "importance", "quadrature", "making")


@dataclass(frozen=True)
class Saved:
    """One hypothesis' reference evidence.

    Attributes:
        number: the case.
        kind: what the case is an example of.
        hypothesis: the hypothesis' name.
        dimensions, bins: the case's size.
        ln_evidence, error: the reference and its standard error [nats].
        method: how it was made.
        evaluations: how many points the likelihood was evaluated at.
        effective: share of the draws that even weights would need for the same spread.
        fingerprint: ln likelihoods that tell whether the case is still the same.
    """

    number: int
    kind: str
    hypothesis: str
    dimensions: int
    bins: int
    ln_evidence: float
    error: float
    method: str
    evaluations: int
    effective: float
    fingerprint: str


def script_digest() -> str:
    """Return the digest of the code that makes references."""
    joined = b"".join((HERE / f"{name}.py").read_bytes() for name in SCRIPT)
    return "sha256:" + hashlib.sha256(joined).hexdigest()


def fingerprint(direct: Direct) -> str:
    """Return the ln likelihood where every coordinate is 0, and where they are 0.5, -1, 0.5, -1, ..."""
    zigzag = np.where(np.arange(direct.size) % 2 == 0, 0.5, -1.0)
    values = direct.ln_likelihood(np.stack([np.zeros(direct.size), zigzag]))
    return " ".join(f"{value:.7g}" for value in values)


def is_same(first: str, second: str) -> bool:
    """Tell whether two fingerprints agree, up to rounding."""
    a, b = (np.array([float(part) for part in text.split()]) for text in (first, second))
    return bool(np.allclose(a, b, rtol=1e-6, atol=1e-6))


def heading() -> str:
    """Return the table's first line."""
    return f"# seed {SEED}, script {script_digest()}"


def read(path: Path = TABLE) -> tuple[str, dict[tuple[int, str], Saved]]:
    """Return the first line, and case and hypothesis to what was saved; nothing where there is no table."""
    if not path.exists():
        return "", {}
    first, _, rest = path.read_text(encoding="utf-8").partition("\n")
    rows = [_row(row) for row in csv.DictReader(io.StringIO(rest))]
    return first, {(row.number, row.hypothesis): row for row in rows}


def _row(row: Mapping[str, str]) -> Saved:
    kinds = {"int": int, "float": float, "str": str}
    return Saved(**{one.name: kinds[str(one.type)](row[one.name]) for one in fields(Saved)})


def write(rows: Iterable[Saved], path: Path = TABLE) -> None:
    """Write the table whole or not at all, its rows in order."""
    text = io.StringIO()
    names = [one.name for one in fields(Saved)]
    writer = csv.writer(text, lineterminator="\n")
    writer.writerow(names)
    for row in sorted(rows, key=lambda one: (one.number, one.hypothesis)):
        writer.writerow([getattr(row, name) for name in names])
    write_text_atomically(path, heading() + "\n" + text.getvalue())
