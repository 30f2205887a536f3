"""Docstrings of public names keep their parts, so that they can't rot."""

from __future__ import annotations

import ast
import inspect
import re
import textwrap
from collections.abc import Iterator
from pathlib import Path

import pytest

import workbench

PACKAGE = Path(__file__).parents[1] / "workbench"
SECTIONS = ("Args", "Attributes", "Returns", "Yields", "Raises", "Limits", "Source")

Definition = ast.FunctionDef | ast.ClassDef


def section(doc: str, title: str) -> str | None:
    """Return the text of one section, or None where there is none."""
    match = re.search(rf"^{title}:\n((?:[ \t]+.*\n?|\n)*)", doc, re.MULTILINE)
    return match.group(1) if match else None


def shows_a_formula(doc: str) -> bool:
    """Say whether an indented line before the sections holds an equation."""
    text = re.split(rf"^(?:{'|'.join(SECTIONS)}):$", doc, maxsplit=1, flags=re.MULTILINE)[0]
    return re.search(r"^ {4,}\S.* = ", text, re.MULTILINE) is not None


def public_definitions(tree: ast.AST) -> Iterator[Definition]:
    """Yield the public functions and classes of a module, and the public functions of its public classes."""
    for node in ast.iter_child_nodes(tree):
        if isinstance(node, Definition) and not node.name.startswith("_"):
            yield node
            if isinstance(node, ast.ClassDef):
                yield from public_definitions(node)


def faults_of_any(node: Definition) -> Iterator[str]:
    """Yield what a public definition lacks: a sentence, and a source where it shows a formula."""
    doc = ast.get_docstring(node)
    if not doc:
        yield f"{node.name} has no docstring"
    elif not doc.split("\n\n")[0].rstrip().endswith((".", ":")):
        yield f"{node.name} does not begin with a sentence"
    elif shows_a_formula(doc) and not (section(doc, "Source") or "").strip():
        yield f"{node.name} shows a formula and names no source"


def faults_of_exported(node: Definition) -> Iterator[str]:
    """Yield what a name on the front page lacks: its arguments or fields, what comes back, a source."""
    doc = ast.get_docstring(node) or ""
    if isinstance(node, ast.ClassDef):
        for line in node.body:
            if isinstance(line, ast.AnnAssign) and isinstance(line.target, ast.Name):
                name = line.target.id
                if "ClassVar" not in ast.unparse(line.annotation) and not re.search(rf"\b{name}\b", doc):
                    yield f"{node.name} does not say what {name} is"
        return
    arguments = [*node.args.posonlyargs, *node.args.args, *node.args.kwonlyargs]
    described = section(doc, "Args") or ""
    for argument in arguments:
        if not re.search(rf"^ +(?:\w+, )*{argument.arg}(?:, \w+)*:", described, re.MULTILINE):
            yield f"{node.name} does not say what {argument.arg} is"
    returns = ast.unparse(node.returns) if node.returns else "None"
    if returns not in {"None", "NoReturn"} and not section(doc, "Returns") and not section(doc, "Yields"):
        yield f"{node.name} does not say what it returns"
    if not (section(doc, "Source") or "").strip():
        yield f"{node.name} names no source"


def definition_of(source: str) -> Definition:
    (node,) = ast.parse(textwrap.dedent(source)).body
    assert isinstance(node, Definition)
    return node


def test_every_public_definition_says_what_it_is() -> None:
    found = [
        f"{path.relative_to(PACKAGE).as_posix()}:{node.lineno}: {fault}"
        for path in sorted(PACKAGE.rglob("*.py"))
        for node in public_definitions(ast.parse(path.read_text(encoding="utf-8")))
        for fault in faults_of_any(node)
    ]
    assert not found, "\n" + "\n".join(found)


@pytest.mark.parametrize("name", workbench.__all__)
def test_every_name_on_the_front_page_is_there_and_explained(name: str) -> None:
    exported = getattr(workbench, name)
    if inspect.isclass(exported) or inspect.isfunction(exported):
        assert list(faults_of_exported(definition_of(inspect.getsource(exported)))) == []


GOOD = '''
    def rate(counts, exposure) -> float:
        """Return the rate.

        With n = counts:
            rate = n / exposure

        Args:
            counts: events.
            exposure: what they are proportional to.

        Returns:
            The rate.

        Source:
            none, definition
        """
'''


def test_a_full_docstring_has_no_faults() -> None:
    assert [*faults_of_any(definition_of(GOOD)), *faults_of_exported(definition_of(GOOD))] == []


@pytest.mark.parametrize(
    ("kept", "lost", "fault"),
    [
        ("            counts: events.\n", "", "rate does not say what counts is"),
        ("        Returns:\n", "        Brings:\n", "rate does not say what it returns"),
        ("            none, definition\n", "", "rate names no source"),
    ],
)
def test_a_lost_part_is_found(kept: str, lost: str, fault: str) -> None:
    assert GOOD.count(kept) == 1
    assert list(faults_of_exported(definition_of(GOOD.replace(kept, lost)))) == [fault]


def test_a_formula_without_a_source_is_found() -> None:
    node = definition_of(GOOD.replace("            none, definition\n", ""))
    assert list(faults_of_any(node)) == ["rate shows a formula and names no source"]


def test_a_field_that_nobody_explains_is_found() -> None:
    node = definition_of('class Rate:\n    """A rate per day."""\n\n    per_day: float\n    day: float')
    assert list(faults_of_exported(node)) == ["Rate does not say what per_day is"]
