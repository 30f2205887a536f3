"""An analysis with one source of uncertainty twice as large: every factor that it makes is squared."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import numpy.typing as npt

from workbench.counts.region import Region
from workbench.hypotheses.analysis import EXPOSURE_SOURCE, Analysis
from workbench.hypotheses.processes import Process
from workbench.hypotheses.shapes import Template
from workbench.hypotheses.uncertainties import Effect

Array = npt.NDArray[np.float64]

_ENDING = ", twice as far from {nominal}"


def doubled_source(analysis: Analysis, name: str) -> Analysis:
    """Return the analysis with one source twice as large.

    With u and d the ln factors at z = 1 and -1, the ln factor f(z; u, d) of a source is linear in both:
        f(z; 2 u, 2 d) = 2 f(z; u, d)
    which for a one-number effect is the factor at 2 z. Where a template variation is additive, its
    differences to the nominal template are doubled instead, held at 0 events at least.

    Args:
        analysis: everything declared.
        name: the source, or that of the exposure.

    Returns:
        The analysis with sizes squared, and with new template columns beside those of its variations.

    Raises:
        InputError: if a doubled size is too large to be worked with.

    Source:
        None, definition.
    """
    exposure = analysis.exposure
    if name == EXPOSURE_SOURCE and exposure is not None and exposure.uncertainty is not None:
        size = _squared(exposure.uncertainty)
        return replace(analysis, exposure=replace(exposure, uncertainty=size))
    source = analysis.uncertainty(name)
    regions = list(analysis.regions)
    effects = []
    for effect in source.effects:
        if isinstance(effect.up, str):
            process = analysis.process(effect.process)
            regions = [_with_columns(region, process, effect) for region in regions]
            nominal = _nominal(process)
            down = None if effect.down is None else _renamed(str(effect.down), nominal)
            effects.append(replace(effect, up=_renamed(effect.up, nominal), down=down))
        else:
            low = None if effect.down is None else _squared(float(effect.down))
            effects.append(replace(effect, up=_squared(effect.up), down=low))
    larger = replace(source, effects=tuple(effects))
    sources = tuple(larger if one is source else one for one in analysis.uncertainties)
    return replace(analysis, regions=tuple(regions), uncertainties=sources)


def _squared(size: float) -> float:
    """Return the relative change of a factor squared, (1 + r)^2 - 1."""
    return size * (2.0 + size)


def _nominal(process: Process) -> str:
    """Return the column that variations of a process are compared with."""
    shapes = [process.regions[name].shape for name in process.regions]
    return next(shape.column for shape in shapes if isinstance(shape, Template))


def _renamed(column: str, nominal: str) -> str:
    return column + _ENDING.format(nominal=nominal)


def _with_columns(region: Region, process: Process, effect: Effect) -> Region:
    """Return a region whose table holds the doubled variations of one effect as well."""
    columns = dict(region.table.columns)
    nominal = _nominal(process)
    names = [name for name in (effect.up, effect.down) if isinstance(name, str) and name in columns]
    if nominal not in columns or not names:
        return region
    centre = columns[nominal]
    is_ratio = np.all([columns[name] > 0.0 for name in (nominal, *names)], axis=0)
    for name in names:
        columns[_renamed(name, nominal)] = _doubled(columns[name], centre, is_ratio)
    return replace(region, table=replace(region.table, columns=columns, digest=""))


def _doubled(varied: Array, nominal: Array, is_ratio: npt.NDArray[np.bool_]) -> Array:
    safe = np.where(is_ratio, nominal, 1.0)
    return np.where(is_ratio, varied * (varied / safe), np.maximum(2.0 * varied - nominal, 0.0))
