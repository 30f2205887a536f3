"""Holds the engine against all saved references and prints the table of pulls. Run apart: it takes minutes.

python -m tests.evidence.references.campaign                # all
python -m tests.evidence.references.campaign --cases 8 20   # these
python -m tests.evidence.references.campaign --write FOLDER --cases 8    # their analysis files
"""

from __future__ import annotations

import argparse
from pathlib import Path

from tests.evidence.references import saved
from tests.evidence.references.cases import TOTAL, case
from tests.evidence.references.pulls import answered, tallies, told
from workbench.hypotheses.file.writing import write_analysis


def main() -> None:
    """Run the campaign, or write the analyses it is about."""
    parser = argparse.ArgumentParser(description="Holds the engine against the saved references.")
    parser.add_argument("--cases", type=int, nargs="*", help="only these")
    parser.add_argument("--seed", type=int, default=1, help="the engine's seed")
    parser.add_argument("--write", type=Path, help="write the analysis files into this folder, and no more")
    options = parser.parse_args()
    numbers = options.cases or range(TOTAL)
    if options.write:
        options.write.mkdir(parents=True, exist_ok=True)
        for number in numbers:
            write_analysis(case(number).analysis, options.write / f"case-{number}.toml")
        return
    _, rows = saved.read()
    answers = []
    for number in numbers:
        answers.append(answered(number, rows, options.seed))
        print(told(answers[-1]), flush=True)
    print("\n".join(tallies(answers)))


if __name__ == "__main__":
    main()
