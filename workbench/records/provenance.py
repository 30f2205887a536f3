"""Which inputs and which versions a result was made from."""

from __future__ import annotations

import platform
import sys
from importlib import metadata

from workbench import __version__
from workbench.hypotheses.analysis import Analysis
from workbench.records.outcomes import Origin

_LIBRARIES = ("numpy", "scipy", "iminuit")


def versions(*more: str) -> dict[str, str]:
    """Return the versions of everything that can change a number.

    Args:
        more: packages used beyond those that always are.
    """
    found = {"oddsbench": __version__}
    for name in (*_LIBRARIES, *more):
        loaded = getattr(sys.modules.get(name), "__version__", None)
        found[name] = str(loaded) if loaded else _installed(name)
    found["python"] = platform.python_version()
    return found


def inputs(analysis: Analysis, origin: Origin) -> dict[str, object]:
    """Return the digests of the analysis and of its tables, by their names as given.

    Two tables of one name and different content (two regions given in Python) carry their region's name.
    """
    tables: dict[str, str] = {}
    for region in analysis.regions:
        name = region.table.source
        if tables.get(name, region.table.digest) != region.table.digest:
            name = f"{name} (region {region.name})"
        tables[name] = region.table.digest
    return {"analysis": origin.digest, "file": origin.file, "content": analysis.digest, "tables": tables}


def _installed(name: str) -> str:
    try:
        return metadata.version(name)
    except metadata.PackageNotFoundError:
        return "not installed"
