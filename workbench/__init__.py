"""Posterior odds for signal against background in binned event counts.

Everything public is reachable from here and imported on first use, so that `import workbench` stays light:

    import workbench as wb
    analysis = wb.read_analysis("skerry.toml")
    weighing = wb.weigh(analysis)
"""

from __future__ import annotations

import importlib
from typing import Any

__version__ = "0.1.0"

_HOMES: dict[str, tuple[str, ...]] = {
    "workbench.errors": ("Caution", "InputError", "Problem"),
    "workbench.counts.binning": ("Binning",),
    "workbench.counts.csv_table": ("read_csv_table",),
    "workbench.counts.region": ("Region",),
    "workbench.counts.table": ("Table",),
    "workbench.ensembles.adequacy": ("adequacy",),
    "workbench.ensembles.build_up": ("build_up", "build_up_steps"),
    "workbench.ensembles.toys": ("toy",),
    "workbench.evidence.prior_choice.sensitivity": ("prior_sensitivity",),
    "workbench.evidence.breaking.break_point": ("break_point",),
    "workbench.evidence.ledger.ledger": ("ledger",),
    "workbench.evidence.backgrounds": ("backgrounds",),
    "workbench.evidence.updating_ratio": ("scan",),
    "workbench.evidence.weigh": ("weigh",),
    "workbench.hypotheses.analysis": ("Analysis", "Exposure", "Hypothesis", "Parameter"),
    "workbench.hypotheses.as_python": ("as_python",),
    "workbench.hypotheses.bare": ("analysis_from_table",),
    "workbench.hypotheses.distortion": ("Distortion",),
    "workbench.hypotheses.priors": (
        "Beta",
        "Exponential",
        "Fixed",
        "Gamma",
        "HalfNormal",
        "LogNormal",
        "LogUniform",
        "Normal",
        "Uniform",
    ),
    "workbench.hypotheses.processes": ("Alternative", "Contribution", "Process"),
    "workbench.hypotheses.quantities": ("Curve",),
    "workbench.hypotheses.file.reading": ("read_analysis",),
    "workbench.hypotheses.shapes": (
        "Bernstein",
        "BreitWigner",
        "CrystalBall",
        "Falling",
        "Flat",
        "Gaussian",
        "PowerLaw",
        "Template",
        "Templates",
        "Voigt",
    ),
    "workbench.hypotheses.uncertainties": ("Effect", "Uncertainty"),
    "workbench.hypotheses.file.writing": ("write_analysis",),
    "workbench.likelihood.fit": ("fit",),
    "workbench.records.scan_reading": ("read_scan",),
}
_HOME_OF = {name: home for home, names in _HOMES.items() for name in names}

__all__ = sorted(_HOME_OF)  # noqa: PLE0605 -- one list of names, not two that drift apart


def __getattr__(name: str) -> Any:
    """Import a public name from its home on first use."""
    home = _HOME_OF.get(name)
    if home is None:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    value = getattr(importlib.import_module(home), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    """List the public names, imported or not."""
    return [*__all__, "__version__"]
