"""Makes the reference evidences of all random analyses, case by case; stopped and started as one likes.

    python -m tests.evidence.references.make                    # what is missing
    python -m tests.evidence.references.make --error 0.0002 --cases 17 23     # these again, and better

A table that another script or seed made is begun anew.
"""

from __future__ import annotations

import argparse
import time

from tests.evidence.references import saved
from tests.evidence.references.cases import SEED, TOTAL, case
from tests.evidence.references.direct import Direct
from tests.evidence.references.making import MOST, WANTED, reference


def made(number: int, wanted: float = WANTED, most: int = MOST, *, drawn: bool = False) -> list[saved.Saved]:
    """Return the references of one case, one a hypothesis."""
    one = case(number)
    rows = []
    for place, hypothesis in enumerate(one.analysis.hypotheses):
        direct = Direct(one.analysis, hypothesis.name)
        found = reference(direct, (SEED, number, place), wanted, most, drawn=drawn)
        rows.append(
            saved.Saved(
                number,
                one.kind,
                hypothesis.name,
                direct.size,
                direct.bins,
                round(found.ln_evidence, 8),
                float(f"{found.error:.3g}"),
                found.method,
                found.evaluations,
                float(f"{found.effective:.3g}"),
                saved.fingerprint(direct),
            )
        )
    return rows


def main() -> None:
    """Make what is missing, or what is asked for again."""
    parser = argparse.ArgumentParser(description="Makes the reference evidences of all random analyses.")
    parser.add_argument("--cases", type=int, nargs="*", help="make these again")
    parser.add_argument("--error", type=float, default=WANTED, help="standard error to stop at [nats]")
    parser.add_argument("--draws", type=int, default=MOST, help="at most how many draws")
    parser.add_argument("--drawn", action="store_true", help="draw also where quadrature would do")
    options = parser.parse_args()
    first, rows = saved.read()
    if first != saved.heading():
        rows = {}
    done = {number for number, _ in rows}
    wanted = options.cases or [number for number in range(TOTAL) if number not in done]
    for number in wanted:
        started = time.perf_counter()
        found = made(number, options.error, options.draws, drawn=options.drawn)
        rows |= {(row.number, row.hypothesis): row for row in found}
        saved.write(rows.values())
        told = ", ".join(f"{row.ln_evidence:.4f} ± {row.error:.2g} ({row.effective:.2f})" for row in found)
        print(
            f"{number:3d} {found[0].kind}, {found[-1].dimensions} dimensions: {told}; "
            f"{time.perf_counter() - started:.1f} s",
            flush=True,
        )


if __name__ == "__main__":
    main()
