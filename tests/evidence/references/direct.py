"""The likelihood written straight from the analysis file's contract, in plain numpy and scipy.

It reads an analysis' public declarations and shares no code with what it checks: no compiled parts, no
derivatives, no priors' maps, no laws of a count.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy import special
from scipy.interpolate import PchipInterpolator

from tests.evidence.references.quantiles import quantile
from tests.evidence.references.spreads import Values, spread
from workbench.counts.region import Region
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.processes import Process
from workbench.hypotheses.quantities import Curve, Quantity
from workbench.hypotheses.shapes import Template, Templates
from workbench.hypotheses.uncertainties import Effect

Array = npt.NDArray[np.float64]

_NUMBERS_AT_ONCE = 100_000  # rows times bins, so that a batch stays in the processor's cache


@dataclass(frozen=True)
class Direct:
    """One hypothesis of an analysis.

    Attributes:
        analysis: everything declared.
        hypothesis: the hypothesis' name.
    """

    analysis: Analysis
    hypothesis: str

    @property
    def parameters(self) -> tuple[str, ...]:
        """Return the free parameters' names."""
        return self.analysis.parameters_used(self.hypothesis)

    @property
    def sources(self) -> tuple[str, ...]:
        """Return the names of the sources at work."""
        return self.analysis.sources_used(self.hypothesis)

    @property
    def size(self) -> int:
        """Return the number of dimensions."""
        return len(self.parameters) + len(self.sources)

    @property
    def bins(self) -> int:
        """Return the number of bins in all regions."""
        return sum(region.table.binning.number for region in self.analysis.regions)

    def values(self, t: Array) -> Values:
        """Return name to (row,) number: parameters in their units, sources in standard deviations."""
        names = (*self.parameters, *self.sources)
        found = {name: t[:, place] for place, name in enumerate(names)}
        for name in self.parameters:
            found[name] = quantile(self.analysis.parameter(name).prior, found[name])
        held = self.analysis.held_parameters(self.hypothesis)
        return found | {name: np.full(len(t), number) for name, number in held.items()}

    def expected(self, values: Values) -> dict[str, tuple[Array, Array]]:
        """Return region to (row, bin) expected events and their variance from the templates' statistics."""
        rows = max((value.size for value in values.values()), default=1)
        found = {}
        for region in self.analysis.regions:
            total = np.zeros((rows, region.table.binning.number))
            variance = np.zeros_like(total)
            for process in self.analysis.processes_of(self.hypothesis):
                if region.name in process.regions:
                    events, spread_squared = self._contribution(process, region, values)
                    total += events
                    variance += spread_squared
            found[region.name] = total, variance
        return found

    def _contribution(self, process: Process, region: Region, values: Values) -> tuple[Array, Array]:
        into = process.regions[region.name]
        factor = product(into.events, values) if into.events is not None else np.ones(1)
        factor = factor * product(process.factors, values)
        exponent, by_bin = self._effects(process, region, values)
        scale = (factor * np.exp(exponent))[:, None] * by_bin
        if isinstance(into.shape, Template):
            column = region.table.columns[into.shape.column]
            scale = scale if into.events is None else scale / column.sum()
            error = region.table.errors.get(into.shape.column) if region.template_errors else None
            return scale * column, np.zeros(1) if error is None else (scale * error) ** 2
        if isinstance(into.shape, Templates):
            columns = np.array([region.table.columns[name] for name in into.shape.columns])
            if into.events is not None:
                columns = columns / columns.sum(axis=1, keepdims=True)
            here = PchipInterpolator(into.shape.at, columns)(values[into.shape.parameter])
            return scale * here, np.zeros(1)
        return scale * spread(into.shape, region.table.binning, values, product), np.zeros(1)

    def _effects(self, process: Process, region: Region, values: Values) -> tuple[Array, Array]:
        """Return (row,) ln of the factors of whole yields, and (row, bin) or (1, 1) those of single bins."""
        exponent, by_bin = np.zeros(1), np.ones((1, 1))
        exposure = self.analysis.exposure
        if exposure is not None and exposure.uncertainty and process.follows_exposure:
            exponent = exponent + np.log1p(exposure.uncertainty) * values["exposure"]
        for source in self.analysis.uncertainties:
            for effect in source.effects:
                reached = (effect.regions, source.regions)
                is_here = all(names is None or region.name in names for names in reached)
                if effect.process != process.name or not is_here:
                    continue
                z = values[source.name]
                if isinstance(effect.up, str):
                    by_bin = by_bin * np.exp(_varied(process, region, effect, z))
                else:
                    exponent = exponent + _resized(effect.up, effect.down, z)
        return exponent, by_bin

    def ln_likelihood(self, t: Array) -> Array:
        """Return (row,) ln probability of the observed counts, the n! included."""
        rows = max(_NUMBERS_AT_ONCE // self.bins, 16)
        parts = [self._ln_likelihood(t[first : first + rows]) for first in range(0, len(t), rows)]
        return np.concatenate(parts) if parts else np.zeros(0)

    def _ln_likelihood(self, t: Array) -> Array:
        expected = self.expected(self.values(t))
        total = np.zeros(len(t))
        for region in self.analysis.regions:
            counts = region.table.observed
            assert counts is not None
            total = total + ln_probability(counts, *expected[region.name]).sum(axis=1)
        return total


def ln_probability(counts: Array, expected: Array, variance: Array) -> Array:
    """Return ln P of counts: Poisson, or negative binomial where the template's own statistics count."""
    poisson = special.xlogy(counts, expected) - expected - special.gammaln(counts + 1.0)
    if not variance.any():
        return np.asarray(poisson)
    shape = expected**2 / np.where(variance > 0.0, variance, 1.0)
    mixed = special.gammaln(counts + shape) - special.gammaln(shape) - special.gammaln(counts + 1.0)
    mixed = mixed - shape * np.log1p(expected / shape) + special.xlogy(counts, expected / (shape + expected))
    return np.asarray(np.where(variance > 0.0, mixed, poisson))


def product(quantity: Quantity | tuple[float | str, ...], values: Mapping[str, Array]) -> Array:
    """Return (row,) or (1,) what a number, a name, a curve or a product of these stands for."""
    total = np.ones(1)
    for factor in quantity if isinstance(quantity, tuple) else (quantity,):
        if isinstance(factor, str):
            total = total * values[factor]
        elif isinstance(factor, Curve):
            total = total * PchipInterpolator(factor.at, factor.values)(values[factor.parameter])
        else:
            total = total * factor
    return total


def _resized(up: float | str, down: float | str | None, z: Array) -> Array:
    """Return (row,) ln of the factor of a change of size."""
    assert isinstance(up, float | int)
    if down is None:
        return np.asarray(np.log1p(up) * z)
    assert isinstance(down, float | int)
    u, d = np.log1p(up), np.log1p(down)
    return np.asarray(0.5 * (u - d) * z + 0.5 * (u + d) * _bend(z))


def _varied(process: Process, region: Region, effect: Effect, z: Array) -> Array:
    """Return (row, bin) ln of the factors of a template variation; every bin of it is above 0."""
    shape = process.regions[region.name].shape
    assert isinstance(shape, Template)
    assert isinstance(effect.up, str)
    assert isinstance(effect.down, str)
    nominal, up, down = (region.table.columns[name] for name in (shape.column, effect.up, effect.down))
    u, d = np.log(up / nominal), np.log(down / nominal)
    return np.asarray(0.5 * (u - d) * z[:, None] + 0.5 * (u + d) * _bend(z)[:, None])


def _bend(z: Array) -> Array:
    return np.asarray((np.sqrt(z * z + 0.0625) - 0.25) / (np.sqrt(1.0625) - 0.25))
