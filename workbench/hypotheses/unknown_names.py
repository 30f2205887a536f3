"""What to say about a name that nobody declared."""

from __future__ import annotations

import re
from collections.abc import Collection

from workbench.errors import nearest, printable, quoted, shortened
from workbench.hypotheses.faults import Fault, KeyPath

NUMBER = re.compile(r"[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?", re.ASCII)


def nearest_name(name: str, known: Collection[str]) -> str:
    """Return what to write instead of a name: the nearest known one, or all of them, in printable letters."""
    return nearest(printable(name), [printable(one) for one in known])


def unknown_fault(
    path: KeyPath, kind: str, name: str, known: Collection[str], owner: str = "declared"
) -> Fault:
    """Return the fault of a name that stands for nothing, with the nearest one that does.

    Args:
        path: where the name is used.
        kind: what it should name, such as "parameter".
        name: the name as given.
        known: the names that stand for something.
        owner: what declares them, for the message.

    Returns:
        The fault.
    """
    listed = ", ".join(sorted(known)) if known else f"none is {owner}"
    if NUMBER.fullmatch(name.strip()) and kind == "parameter":
        remedy = f"write {name.strip()} without quotes, if it is a number"
    else:
        remedy = nearest_name(name, known) if known else f"declare the {kind} {quoted(name)}"
    return Fault(
        path, f"A {kind} that is not {owner}", quoted(name), f"a {kind}: {shortened(listed)}", remedy
    )
