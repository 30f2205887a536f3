"""Imports go one way, and heavy libraries have one home each."""

from __future__ import annotations

import ast
from collections.abc import Iterator
from pathlib import Path

import pytest

PACKAGE = Path(__file__).parents[1] / "workbench"

# Each place may import itself and what stands before it.
PLACES = (
    "errors", "counts", "hypotheses", "likelihood", "evidence", "ensembles", "records", "plots", "widgets",
    "commands",
)  # fmt: skip
HOMES = {
    "matplotlib": "plots/",
    "ipywidgets": "widgets/",
    "anywidget": "widgets/",
    "traitlets": "widgets/",
    "IPython": "widgets/",
    "iminuit": "likelihood/fit.py",
    "dynesty": "evidence/nested.py",
}


def imported(tree: ast.AST) -> Iterator[tuple[int, str]]:
    """Yield the line and full name of everything that a file imports, wherever in the file it does."""
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            yield from ((node.lineno, alias.name) for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            module = "." * node.level + (node.module or "")
            names = [f"{module}.{alias.name}" for alias in node.names] if module == "workbench" else [module]
            yield from ((node.lineno, name) for name in names)


def faults(name: str, source: str) -> Iterator[str]:
    """Yield what is wrong with the imports of one file, named as seen from the package's folder."""
    place, file = Path(name).with_suffix("").parts[0], Path(name).stem
    if place not in PLACES:
        yield f"{name}: {place} has no place in the list of layers"
        return
    for line, module in imported(ast.parse(source)):
        top, _, rest = module.partition(".")
        if module == "workbench" or top == "":
            yield f"{file}.py:{line}: {place} must name what it imports in full"
        elif top == "workbench":
            other = rest.split(".")[0]
            if other != "__version__" and other not in PLACES[: PLACES.index(place) + 1]:
                yield f"{file}.py:{line}: {place} must not import {other}"
        elif top in HOMES and not name.startswith(HOMES[top]):
            yield f"{file}.py:{line}: {place} must not import {top}, whose home is {HOMES[top]}"


def test_every_import_goes_to_a_layer_before_its_own() -> None:
    files = [path for path in sorted(PACKAGE.rglob("*.py")) if path != PACKAGE / "__init__.py"]
    found = [
        fault for path in files for fault in faults(path.relative_to(PACKAGE).as_posix(), path.read_text())
    ]
    assert not found, "\n" + "\n".join(found)


def test_every_layer_in_the_list_is_there() -> None:
    assert [place for place in PLACES if not list(PACKAGE.glob(f"{place}*"))] == []


def test_the_front_page_imports_nothing_of_ours_until_it_is_asked() -> None:
    modules = [module for _, module in imported(ast.parse((PACKAGE / "__init__.py").read_text()))]
    assert sorted(modules) == ["__future__", "importlib", "typing"]


@pytest.mark.parametrize(
    ("name", "source", "fault"),
    [
        (
            "counts/histogram.py",
            "\nimport workbench.plots.odds",
            "histogram.py:2: counts must not import plots",
        ),
        (
            "counts/a.py",
            "def f():\n    from workbench import evidence",
            "a.py:2: counts must not import evidence",
        ),
        ("counts/a.py", "import workbench as wb", "a.py:1: counts must name what it imports in full"),
        ("evidence/a.py", "from . import b", "a.py:1: evidence must name what it imports in full"),
        (
            "evidence/a.py",
            "import iminuit",
            "a.py:1: evidence must not import iminuit, whose home is likelihood/fit.py",
        ),
        ("errors.py", "from workbench.counts import table", "errors.py:1: errors must not import counts"),
        ("stray/a.py", "", "stray/a.py: stray has no place in the list of layers"),
    ],
)
def test_a_wrong_import_is_found(name: str, source: str, fault: str) -> None:
    assert list(faults(name, source)) == [fault]
