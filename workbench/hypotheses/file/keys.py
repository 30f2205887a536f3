"""Reading the keys of one table of a TOML file: types, left-out keys, unknown keys.

Every reading method notes what is wrong and goes on with a stand-in, so that one pass tells everything; what
was read is used only where nothing was noted.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator, Mapping

from workbench.errors import Problem, nearest, shortened
from workbench.hypotheses.faults import Fault, KeyPath, Place, shown


class Findings:
    """The problems met while reading one file.

    Attributes:
        place: key path to words.
    """

    def __init__(self, place: Place, line: Callable[[KeyPath], int | None] | None = None) -> None:
        self.place = place
        self._line = line
        self._problems: list[tuple[int, Problem]] = []

    @property
    def problems(self) -> list[Problem]:
        """Return what is wrong, from the top of the file to its end."""
        return [problem for _, problem in sorted(self._problems, key=lambda one: one[0])]

    def add(self, fault: Fault) -> None:
        """Note a fault."""
        self.tell(fault.problem(self.place), fault.path)

    def tell(self, problem: Problem, path: KeyPath) -> None:
        """Note a problem that a key leads to."""
        self._problems.append(((self._line(path) or 0) if self._line else 0, problem))


class Section:
    """One table of the file.

    Attributes:
        content: keys to values as read.
        path: where the table stands.
        findings: where faults go.
        is_sound: False once a key could not be read.
    """

    def __init__(self, content: Mapping[str, object], path: KeyPath, findings: Findings) -> None:
        self.content = content
        self.path = path
        self.findings = findings
        self.is_sound = True
        self._known: set[str] = set()

    def refuse(self, key: str | None, what: str, found: str, expected: str, remedy: str) -> None:
        """Note a fault of a key, or of the table, that keeps the table from being used."""
        self.is_sound = False
        path = self.path if key is None else (*self.path, key)
        self.findings.add(Fault(path, what, found, expected, remedy))

    def has(self, key: str) -> bool:
        """Tell whether the file gives a key."""
        self._known.add(key)
        return key in self.content

    def value(self, key: str, expected: str) -> object:
        """Return the value of a key that the table needs; None, with a fault, where it is left out."""
        if not self.has(key):
            self.refuse(
                None, f"The key {key} is left out", "no such key", f"{key} = {expected}", f"add {key}"
            )
            return None
        return self.content[key]

    def number(self, key: str, default: float | None = None) -> float:
        """Return a number; needed unless a default is given."""
        if default is not None and not self.has(key):
            return default
        value = self.value(key, "a number")
        return 0.0 if value is None else self.as_number(value, (key,))

    def number_if_given(self, key: str) -> float | None:
        """Return a number, or None where the key is left out."""
        return self.number(key) if self.has(key) else None

    def whole_number(self, key: str, default: int) -> int:
        """Return a whole number; the default, with a fault, where it is another one."""
        number = self.number(key, float(default))
        if number.is_integer():
            return int(number)
        self.refuse(
            key, f"{key} has a fraction", shown(number), "a whole number", "write it without a fraction"
        )
        return default

    def text(self, key: str, default: str | None = None) -> str:
        """Return a text; needed unless a default is given."""
        if default is not None and not self.has(key):
            return default
        value = self.value(key, "a text")
        return "" if value is None else self.as_text(value, (key,))

    def truth(self, key: str, default: bool) -> bool:
        """Return true or false."""
        if not self.has(key):
            return default
        value = self.content[key]
        if isinstance(value, bool):
            return value
        self.refuse(
            key, f"{key} is neither true nor false", shown(value), "true or false", "write true or false"
        )
        return default

    def numbers(self, key: str) -> tuple[float, ...]:
        """Return a list of numbers that the table needs."""
        values = self._list(key, "a list of numbers")
        return tuple(self.as_number(value, (key, place)) for place, value in enumerate(values))

    def texts(self, key: str) -> tuple[str, ...]:
        """Return a list of texts that the table needs."""
        values = self._list(key, "a list of names")
        return tuple(self.as_text(value, (key, place)) for place, value in enumerate(values))

    def section(self, key: str, expected: str) -> Section | None:
        """Return a table inside this one; None, with a fault, where there is none."""
        value = self.value(key, expected)
        return None if value is None else self.as_section(value, (key,), expected)

    def sections(self, key: str, expected: str) -> Iterator[tuple[str, Section | None]]:
        """Yield the named tables under a key; nothing where the key is left out."""
        if not self.has(key):
            return
        holder = self.section(key, "a table of named tables")
        for name in holder.content if holder is not None else ():
            yield name, holder.as_section(holder.content[name], (name,), expected) if holder else None

    def as_section(self, value: object, inside: KeyPath, expected: str) -> Section | None:
        """Return a value as a table; None, with a fault, where it is something else."""
        if isinstance(value, dict):
            return Section(value, self.path + inside, self.findings)
        self._refuse_type(inside, "is not a table", value, expected, "write a table here")
        return None

    def as_number(self, value: object, inside: KeyPath) -> float:
        """Return a value as a finite number; 0, with a fault, where it is something else."""
        if isinstance(value, bool) or not isinstance(value, int | float):
            self._refuse_type(inside, "is not a number", value, "a number", "write a number without quotes")
            return 0.0
        try:
            number = float(value)
        except OverflowError:
            number = math.inf
        if not math.isfinite(number):
            self._refuse_type(
                inside, "is not a finite number", value, "a finite number", "write a finite number"
            )
            return 0.0
        return number

    def as_text(self, value: object, inside: KeyPath) -> str:
        """Return a value as a text; an empty one, with a fault, where it is something else."""
        if not isinstance(value, str):
            self._refuse_type(inside, "is not a text", value, "a text", "put it in quotes")
            return ""
        if not value.isprintable():
            expected = "letters, digits, signs and spaces on one line"
            self._refuse_type(inside, "cannot be printed", value, expected, "leave out what cannot be seen")
            return ""
        return value

    def close(self) -> None:
        """Note every key that nobody asked for, with the nearest known one."""
        for key in self.content:
            if key not in self._known:
                known = ", ".join(sorted(self._known))
                self.findings.add(
                    Fault(
                        (*self.path, key),
                        "A key that is not known here",
                        shortened(key),
                        f"one of: {known}" if known else "no keys in this table",
                        nearest(key, self._known),
                    )
                )

    def _list(self, key: str, expected: str) -> list[object]:
        value = self.value(key, expected)
        if value is None:
            return []
        if isinstance(value, list):
            return value
        self.refuse(key, f"{key} is not a list", shown(value), expected, "put it in square brackets")
        return []

    def _refuse_type(self, inside: KeyPath, what: str, value: object, expected: str, remedy: str) -> None:
        self.is_sound = False
        name = next((str(step) for step in reversed(inside) if isinstance(step, str)), "the value")
        if isinstance(inside[-1], int):
            what = f"An entry of {shortened(name)} {what}"
        else:
            what = f"{shortened(name)} {what}"
        self.findings.add(Fault(self.path + inside, what, shown(value), expected, remedy))
