"""Where an effect acts."""

from __future__ import annotations

from workbench.hypotheses.processes import Process
from workbench.hypotheses.uncertainties import Effect, Uncertainty


def regions_acted_on(effect: Effect, source: Uncertainty, process: Process) -> tuple[str, ...]:
    """Return the regions in which an effect acts on a process.

    Args:
        effect: the effect.
        source: the source it belongs to, which may be limited to some regions.
        process: the process that it names.

    Returns:
        Region names, in the process' order.

    Source:
        none, definition
    """
    return tuple(
        region
        for region in process.region_names
        if (effect.regions is None or region in effect.regions)
        and (source.regions is None or region in source.regions)
    )
