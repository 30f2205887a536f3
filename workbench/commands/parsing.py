"""Options understood, and what can't be understood said in the form of every other problem."""

from __future__ import annotations

import argparse
import math
import sys
from collections.abc import Callable, Sequence
from typing import IO, NoReturn, TextIO, cast

from workbench.commands.terminal import print_text
from workbench.counts.magnitudes import LARGEST_FACTOR, is_workable
from workbench.errors import InputError, Problem, nearest, quoted


class Parser(argparse.ArgumentParser):
    """An argument parser that raises `InputError` instead of printing and leaving."""

    def __init__(self, prog: str, description: str = "") -> None:
        super().__init__(prog=prog, description=description, allow_abbrev=False, exit_on_error=False)
        self.add_argument(
            "file", metavar="FILE", nargs="?", help="an analysis (.toml) or a histogram (.csv, .tsv)"
        )

    def understand(self, words: Sequence[str]) -> argparse.Namespace:
        """Return the options as attributes.

        Args:
            words: the command line after the subcommand.

        Raises:
            InputError: for an unknown or incomplete option, too many files, or none.
        """
        try:
            found, strangers = self.parse_known_args(list(words))
        except argparse.ArgumentError as error:
            raise InputError(self._incomplete(error)) from error
        if strangers:
            raise InputError(*(self._stranger(word) for word in strangers))
        if found.file is None and getattr(found, "reprior", None) is None:
            raise InputError(
                Problem("No file was named", self.prog, "no FILE", "one file", f"{self.prog} FILE, or --help")
            )
        return found

    def error(self, message: str) -> NoReturn:
        """Raise what argparse would have printed."""
        raise InputError(
            Problem("Options not understood", self.prog, message, "what --help shows", f"{self.prog} --help")
        )

    def _print_message(self, message: str, file: IO[str] | None = None) -> None:  # type: ignore[override]
        print_text(message, sys.stdout if file is None else cast("TextIO", file))

    def _incomplete(self, error: argparse.ArgumentError) -> Problem:
        name = error.argument_name or "the options"
        where, remedy = f"{self.prog}, {name}", f"{self.prog} --help"
        if error.message.startswith("expected"):
            return Problem("Option without its value", where, "nothing after it", "one value", remedy)
        found = error.message.replace("'", '"')
        return Problem("Option not understood", where, found, "the option as --help shows it", remedy)

    def _stranger(self, word: str) -> Problem:
        if not word.startswith("-"):
            return Problem(
                "More than one file", self.prog, quoted(word), "one FILE", "name one file at a time"
            )
        known = [name for action in self._actions for name in action.option_strings if name.startswith("--")]
        option = word.split("=", 1)[0]
        return Problem(
            "Unknown option", self.prog, quoted(option), "an option of this command", nearest(option, known)
        )


def whole_number(option: str, lowest: int, highest: int) -> Callable[[str], int]:
    """Return a reader of whole numbers in a range, for argparse's `type`.

    Args:
        option: the option's name, for the problem.
        lowest: the smallest number allowed.
        highest: the largest number allowed.
    """

    def read(text: str) -> int:
        expected = f"a whole number from {lowest:,} to {highest:,}"
        try:
            number = int(text)
        except ValueError:
            number = lowest - 1
        if not lowest <= number <= highest:
            raise InputError(
                Problem(
                    f"{option} is not in its range",
                    option,
                    quoted(text),
                    expected,
                    f"{option} {max(lowest, 1)}",
                )
            )
        return number

    return read


def number(option: str) -> Callable[[str], float]:
    """Return a reader of a finite number, for argparse's `type`.

    Args:
        option: the option's name, for the problem.
    """
    return _numbers(option, "a number", "a number, such as 3 or -0.5", "3", is_workable)


def one_of(option: str, known: Sequence[str]) -> Callable[[str], str]:
    """Return a reader of one of several words, for argparse's `type`.

    Args:
        option: the option's name, for the problem.
        known: the words allowed.
    """

    def read(text: str) -> str:
        if text not in known:
            raise InputError(
                Problem(
                    f"{option} is none of its choices",
                    option,
                    quoted(text),
                    "one of: " + ", ".join(known),
                    nearest(text, known),
                )
            )
        return text

    return read


def probability_between(option: str) -> Callable[[str], float]:
    """Return a reader of a probability that is neither 0 nor 1, for argparse's `type`.

    Args:
        option: the option's name, for the problem.
    """
    expected = "a number above 0 and below 1; 0.99 is ninety-nine per cent"
    return _numbers(
        option, "a probability between 0 and 1", expected, "0.99", lambda x: 1e-12 <= x <= 1.0 - 1e-12
    )


def relative_size(option: str) -> Callable[[str], float]:
    """Return a reader of a relative uncertainty, for argparse's `type`.

    Args:
        option: the option's name, for the problem.
    """
    expected = "0, or 1e-100 to 1e6; 0.10 is ten per cent"
    return _numbers(
        option, "a relative size", expected, "0.10", lambda x: is_workable(x) and 0.0 <= x <= LARGEST_FACTOR
    )


def _numbers(
    option: str, what: str, expected: str, example: str, is_allowed: Callable[[float], bool]
) -> Callable[[str], float]:
    """Return a reader of numbers of one kind; what is no number at all is not allowed either."""

    def read(text: str) -> float:
        try:
            value = float(text)
        except ValueError:
            value = math.nan
        if not is_allowed(value):
            raise InputError(
                Problem(f"{option} is not {what}", option, quoted(text), expected, f"{option} {example}")
            )
        return value

    return read
