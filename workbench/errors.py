"""What can be wrong with an input, said so that it can be mended.

A `Problem` is one fault in something the user gave; `InputError` carries all the faults found at once.
A `Caution` is something worth knowing about a result that stands. The names of the user's things stand in
double quotes everywhere.
"""

from __future__ import annotations

import difflib
from collections.abc import Iterable
from dataclasses import dataclass

LONGEST_SHOWN = 60


@dataclass(frozen=True, slots=True)
class Problem:
    """One fault in an input, in the parts that a user needs to mend it.

    Attributes:
        what: the fault in a few words.
        where: the file, line, key, column or option.
        found: the value as given.
        expected: the condition that it breaks.
        remedy: an action that works, said after "try".
    """

    what: str
    where: str
    found: str
    expected: str
    remedy: str

    def text(self) -> str:
        """Return the block of lines that the terminal prints and a control shows."""
        return (
            f"{self.what}\n"
            f"  where     {self.where}\n"
            f"  found     {self.found}\n"
            f"  expected  {self.expected}\n"
            f"  try       {self.remedy}"
        )


class InputError(Exception):
    """Everything that is wrong with one input, told at once."""

    def __init__(self, *problems: Problem) -> None:
        self.problems = problems
        super().__init__("\n\n".join(problem.text() for problem in problems))

    def __reduce__(self) -> tuple[type[InputError], tuple[Problem, ...]]:
        """Travel from a worker process with the problems, not with their text."""
        return type(self), self.problems


@dataclass(frozen=True, slots=True)
class Caution:
    """Something worth knowing about a result that stands.

    Attributes:
        code: a short name that stays the same.
        text: the sentence.
    """

    code: str
    text: str


def nearest(word: str, known: Iterable[str]) -> str:
    """Return a sentence naming the known word nearest to a misspelt one, or all of them."""
    choices = sorted(known)
    close = difflib.get_close_matches(word, choices, n=1, cutoff=0.6)
    if close:
        return f"write {quoted(close[0])}"
    return "use one of: " + ", ".join(choices) if choices else "leave it out"


def quoted(word: str) -> str:
    """Return one of the user's words in double quotes, on one line, cut where it is long."""
    return '"' + shortened(word) + '"'


def shortened(text: str) -> str:
    """Return a text that can be printed, cut to what fits on a line of the terminal."""
    text = printable(text)
    return text if len(text) <= LONGEST_SHOWN else text[: LONGEST_SHOWN - 3] + "..."


def printable(text: str) -> str:
    """Return a text with everything that a terminal would not show, or act on, spelt out."""
    return "".join(letter if letter.isprintable() else f"\\u{ord(letter):04x}" for letter in text)
