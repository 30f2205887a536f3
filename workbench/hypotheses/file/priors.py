"""Priors as the analysis file and the command line say them."""

from __future__ import annotations

import math
import tomllib
from dataclasses import MISSING, fields
from typing import Any

import numpy as np

from workbench.errors import InputError, nearest, printable, quoted
from workbench.hypotheses.faults import Fault, shown, toml_fault_text
from workbench.hypotheses.file.keys import Findings, Section
from workbench.hypotheses.priors import FAMILIES, Prior

PRIOR = "{ FAMILY = { ... } }"
EXAMPLE = "{ uniform = { low = 0, high = 5 } }"
IMPROPER = "a finite number: a prior without end cannot be normalised, and the evidence would be 0"


def read_prior(section: Section, key: str = "prior") -> Prior | None:
    """Return the prior under a key; None, with the faults noted, where it cannot be read."""
    holder = section.section(key, PRIOR)
    if holder is None:
        return None
    section.is_sound = False
    if len(holder.content) != 1:
        section.refuse(
            key,
            "A prior has exactly one family",
            shown(holder.content),
            PRIOR,
            "keep one family: " + ", ".join(FAMILIES)
            if any(name in FAMILIES for name in holder.content)
            else f"name the family around the numbers, such as {EXAMPLE}",
        )
        return None
    family = next(iter(holder.content))
    if family not in FAMILIES:
        section.refuse(
            key,
            "A prior family that is not known",
            quoted(family),
            "a family of proper priors",
            nearest(family, FAMILIES),
        )
        return None
    inner = holder.section(family, "a table with the family's numbers")
    prior = None if inner is None else _prior(family, inner)
    section.is_sound = prior is not None
    return prior


def _prior(family: str, section: Section) -> Prior | None:
    made = FAMILIES[family]
    numbers: dict[str, Any] = {}
    for field in fields(made):
        if section.has(field.name) or field.default is MISSING:
            numbers[field.name] = _number(section, field.name, field.default is None)
    section.close()
    if not section.is_sound:
        return None
    try:
        with np.errstate(all="ignore"):
            return made(**numbers)
    except InputError as error:
        for problem in error.problems:
            section.findings.add(
                Fault(section.path, problem.what, problem.found, problem.expected, problem.remedy)
            )
    return None


def _number(section: Section, key: str, is_end_optional: bool) -> float:
    value = section.content.get(key)
    if not isinstance(value, float) or not math.isinf(value):
        return section.number(key)
    if is_end_optional:
        section.refuse(
            key,
            "An end that is infinite",
            f"{key} = {shown(value)}",
            "a finite number: this prior falls off by itself",
            f"leave {key} out",
        )
    else:
        section.refuse(
            key,
            "An improper prior",
            f"{key} = {shown(value)}",
            IMPROPER,
            "write a finite range, or a family that falls off, such as exponential or halfnormal",
        )
    return 0.0


def parse_prior(text: str, shown_as: str = "--strength") -> Prior:
    """Return the prior that an inline TOML value writes, as after `prior =` in an analysis file.

    Args:
        text: for instance "{ halfnormal = { sd = 1.0 } }".
        shown_as: what the user calls it, for the messages.

    Returns:
        The prior.

    Raises:
        InputError: if the text is no prior.
    """
    findings = Findings(lambda path: ", ".join([shown_as, *(str(step) for step in path[1:])]))
    try:
        content = tomllib.loads("prior = " + text)
    except (ValueError, RecursionError) as error:
        raise InputError(_unreadable(text, error).problem(findings.place)) from error
    if len(content) > 1:
        fault = Fault(
            ("prior",), "More than one value where a prior belongs", shown(text), PRIOR, "give one prior"
        )
        raise InputError(fault.problem(findings.place))
    prior = read_prior(Section(content, (), findings))
    if prior is None or findings.problems:
        raise InputError(*findings.problems)
    return prior


def _unreadable(text: str, error: Exception) -> Fault:
    """Return what keeps a text from being an inline TOML table, and a text that is one."""
    what, missing, whole = "A prior that cannot be read", _reason(error), EXAMPLE
    if _is_inside_of_a_table(text):
        what, missing = "A prior without its outer braces", "no { before it and no } after it"
        whole = f"{{ {printable(text.strip())} }}"
    elif not text.strip().startswith("{"):
        missing = "no { at its start"
    remedy = f'write "{whole}", the quotes for the shell'
    return Fault(("prior",), what, f"{shown(text)}: {missing}", f"{PRIOR}, braces included", remedy)


def _is_inside_of_a_table(text: str) -> bool:
    """Tell whether outer braces are all that is missing."""
    try:
        inner = tomllib.loads(f"prior = {{ {text} }}")["prior"]
    except (ValueError, RecursionError):
        return False
    return isinstance(inner, dict) and len(inner) == 1 and isinstance(next(iter(inner.values())), dict)


def _reason(error: Exception) -> str:
    if isinstance(error, RecursionError):
        return "brackets nested too deeply"
    return toml_fault_text(str(error).partition(" (at ")[0]).lower()
