"""What an analysis declares, by name, while it is being checked."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from workbench.counts.region import Region
from workbench.hypotheses.exposure import Exposure
from workbench.hypotheses.hypothesis import Hypothesis
from workbench.hypotheses.parameters import Parameter
from workbench.hypotheses.processes import Process
from workbench.hypotheses.uncertainties import Uncertainty


@dataclass(frozen=True, slots=True)
class Declared:
    """Everything declared, by name and in order.

    A name whose content could not be read has None, so that a mention of it is not taken for a misspelling
    and what depends on its content is left unchecked.

    Attributes:
        regions, parameters, processes, uncertainties, hypotheses: name to content.
        exposure: what yields are proportional to.
    """

    regions: Mapping[str, Region | None]
    parameters: Mapping[str, Parameter | None]
    processes: Mapping[str, Process | None]
    uncertainties: Mapping[str, Uncertainty | None]
    hypotheses: Mapping[str, Hypothesis | None]
    exposure: Exposure | None
