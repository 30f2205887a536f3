"""A hypothesis ready to be evaluated: expected counts and the log likelihood for many points at once."""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
import numpy.typing as npt

from workbench.errors import InputError, Problem, quoted
from workbench.hypotheses.analysis import Analysis
from workbench.likelihood.assembly import assemble
from workbench.likelihood.coordinates import Coordinate, coordinates_of
from workbench.likelihood.distortions import with_distortion
from workbench.likelihood.kernel import Expansion, expand
from workbench.likelihood.laws import bin_ln_probability
from workbench.likelihood.memory import keep_freed_memory
from workbench.likelihood.parts import Part, Seeds, Sources
from workbench.likelihood.slopes import negative_binomial_slopes, poisson_slopes

Array = npt.NDArray[np.float64]
Indices = npt.NDArray[np.intp]


@dataclass(frozen=True, eq=False)
class Model:
    """One hypothesis of an analysis, compiled.

    Attributes:
        analysis: the analysis it belongs to.
        hypothesis: the hypothesis' name.
        coordinates: every free parameter (declaration order), then every source in use.
        parts: every process in every region.
        overall: sources that act on all bins of a part alike, one row a part.
        observed: (bin,) observed counts of all regions in order [events]; None when planning.
        spare: (bin,) expected events added to bins that no background can fill, where the region asks for it.
    """

    analysis: Analysis
    hypothesis: str
    coordinates: tuple[Coordinate, ...]
    parts: tuple[Part, ...]
    overall: Sources
    observed: Array | None
    bins: int
    spare: Array

    @property
    def size(self) -> int:
        """Return the number of coordinates."""
        return len(self.coordinates)

    @cached_property
    def signal(self) -> Indices:
        """Return the indices of signal parameters: shapes first, then strengths."""
        found = [i for i, c in enumerate(self.coordinates) if c.role == "signal"]
        return np.array(sorted(found, key=lambda i: self.coordinates[i].is_strength), dtype=np.intp)

    @cached_property
    def has_template_errors(self) -> bool:
        """Return True when some bin's law is negative binomial."""
        return any(part.error is not None for part in self.parts) or bool(self.spare.any())

    @cached_property
    def effort(self) -> int:
        """Return how many products one point takes: bins, and bins times sources that act by bin."""
        widths = [part.bins.stop - part.bins.start for part in self.parts]
        sources = [0 if part.by_bin is None else part.by_bin.indices.size for part in self.parts]
        return sum(width * (1 + number) for width, number in zip(widths, sources, strict=True))

    @cached_property
    def names(self) -> tuple[str, ...]:
        """Return the coordinates' names in order."""
        return tuple(coordinate.name for coordinate in self.coordinates)

    def observed_for(self, purpose: str) -> Array:
        """Return the observed counts, (bin,).

        Args:
            purpose: what needs them, to say so where there are none.

        Returns:
            Counts of all regions in order [events].

        Raises:
            InputError: if a region has no observed counts.
        """
        if self.observed is None:
            raise InputError(
                Problem(
                    what=f"{purpose} needs observed counts",
                    where=f"hypothesis {quoted(self.hypothesis)}",
                    found='a region without the column "observed"',
                    expected="observed counts in every bin",
                    remedy='add a column "observed"',
                )
            )
        return self.observed

    def seeds(self, points: Array, still: frozenset[int] = frozenset()) -> Seeds:
        """Return parameter values and derivatives at standard-normal coordinates.

        Args:
            points: (batch, coordinate) standard-normal coordinates.
            still: parameters whose derivatives are not wanted.

        Returns:
            Seeds with (coordinate, batch) arrays.
        """
        x, dx, ddx = np.array(points.T), np.ones_like(points.T), np.zeros_like(points.T)
        for index, coordinate in enumerate(self.coordinates):
            if coordinate.role != "source":
                x[index], dx[index], ddx[index] = coordinate.prior.from_standard(points[:, index])
        return Seeds(x, dx, ddx, still)

    def natural_seeds(self, points: Array) -> Seeds:
        """Return seeds whose coordinates are the parameters themselves, (batch, coordinate)."""
        return Seeds(np.array(points.T), np.ones_like(points.T), np.zeros_like(points.T))

    def expected(self, seeds: Seeds) -> tuple[Array, Array | None]:
        """Return (batch, bin) expected events and, with template errors, their variance.

        Args:
            seeds: (coordinate, batch) parameter values.

        Returns:
            T [events] and V [events^2] (None where every bin is Poisson).
        """
        batch = seeds.x.shape[1]
        total = np.zeros((batch, self.bins)) + self.spare
        variance = np.zeros((batch, self.bins)) + self.spare**2 if self.has_template_errors else None
        factors = self.overall.factors(seeds.x)
        for row, part in enumerate(self.parts):
            factor = self._factor(part, factors[:, row, None], seeds)
            total[:, part.bins] += part.stem.value(seeds, factor)
            if part.error is not None and variance is not None:
                variance[:, part.bins] += part.error.value(seeds, factor) ** 2
        return total, variance

    def _factor(self, part: Part, overall: Array, seeds: Seeds) -> Array:
        return overall if part.by_bin is None else overall * part.by_bin.factors(seeds.x)

    def by_process(self, seeds: Seeds) -> dict[str, Array]:
        """Return process name to (batch, bin) expected events."""
        found: dict[str, Array] = {}
        factors = self.overall.factors(seeds.x)
        for row, part in enumerate(self.parts):
            target = found.setdefault(part.process, np.zeros((seeds.x.shape[1], self.bins)))
            factor = self._factor(part, factors[:, row, None], seeds)
            target[:, part.bins] += part.stem.value(seeds, factor)
        return found

    def restricted(self, kind: str, *, spare: bool) -> Model:
        """Return the same coordinates with the processes of one kind only, "signal" or "background"."""
        kinds = {process.name: process.kind for process in self.analysis.processes}
        rows = [row for row, part in enumerate(self.parts) if kinds[part.process] == kind]
        overall = replace(self.overall, linear=self.overall.linear[:, rows], bend=self.overall.bend[:, rows])
        parts = tuple(self.parts[row] for row in rows)
        return replace(self, parts=parts, overall=overall, spare=self.spare if spare else np.zeros(self.bins))

    def responses(self, seeds: Seeds) -> Array:
        """Return (batch, coordinate, bin) first derivatives of the expected events."""
        expansion, _ = expand(self.parts, self.overall, self.size, seeds)
        return expansion.gradient(seeds.x.shape[1], self.bins)

    def ln_likelihood(self, seeds: Seeds, counts: Array) -> Array:
        """Return the ln probability of counts.

        Args:
            seeds: (coordinate, batch) parameter values.
            counts: (bin,) or (batch, bin) counted events [events].

        Returns:
            (batch,) ln probability [nats]; -inf where an impossible count is observed.
        """
        return np.asarray(bin_ln_probability(*self.expected(seeds), counts).sum(axis=-1))

    def derivatives(self, seeds: Seeds, counts: Array) -> tuple[Array, Array, Array]:
        """Return the ln probability of counts with exact first and second derivatives.

        Args:
            seeds: (coordinate, batch) parameter values with derivatives in the coordinates in force.
            counts: (bin,) or (batch, bin) counted events [events].

        Returns:
            (batch,) ln probability, (batch, coordinate) gradient, (batch, coordinate, coordinate) Hessian.
        """
        events, errors = expand(self.parts, self.overall, self.size, seeds)
        batch = seeds.x.shape[1]
        total = np.zeros((batch, self.bins)) + self.spare
        for piece in events.pieces:
            total[:, piece.bins] += piece.events
        if errors is None and not self.has_template_errors:
            slopes = poisson_slopes(counts, total)
            value = bin_ln_probability(total, None, counts).sum(axis=-1)
            return value, *events.contracted(slopes.t, slopes.tt)
        return self._noisy(events, errors, total, counts)

    def _noisy(
        self, events: Expansion, errors: Expansion | None, total: Array, counts: Array
    ) -> tuple[Array, Array, Array]:
        """Return the derivatives of the negative binomial: T as before, V = sum of squared errors."""
        variance = np.zeros_like(total) + self.spare**2
        for piece in () if errors is None else errors.pieces:
            variance[:, piece.bins] += piece.events**2
        slopes = negative_binomial_slopes(counts, total, variance)
        value = bin_ln_probability(total, variance, counts).sum(axis=-1)
        gradient, hessian = events.contracted(slopes.t, slopes.tt)
        if errors is None:
            return value, gradient, hessian
        slope = events.gradient(*total.shape)
        tilt = errors.add_squares(slopes.v, hessian)
        gradient += (tilt @ slopes.v[:, :, None])[..., 0]
        cross = (slope * slopes.tv[:, None, :]) @ np.swapaxes(tilt, 1, 2)
        hessian += cross + np.swapaxes(cross, 1, 2)
        hessian += (tilt * slopes.vv[:, None, :]) @ np.swapaxes(tilt, 1, 2)
        return value, gradient, hessian


def compile_model(analysis: Analysis, hypothesis: str) -> Model:
    """Return a hypothesis of an analysis, ready to be evaluated.

    Args:
        analysis: everything declared.
        hypothesis: the hypothesis' name.

    Returns:
        The model with its coordinates and parts.

    Raises:
        InputError: if the analysis has no such hypothesis.
    """
    return _with_spare(_without_spare(analysis, hypothesis))


def _without_spare(analysis: Analysis, hypothesis: str) -> Model:
    keep_freed_memory()
    coordinates = coordinates_of(analysis, hypothesis)
    held = analysis.held_parameters(hypothesis)
    positions = {coordinate.name: index for index, coordinate in enumerate(coordinates)}
    parts, overall = assemble(analysis, hypothesis, positions, held)
    bins = sum(region.table.binning.number for region in analysis.regions)
    counts = [region.table.observed for region in analysis.regions]
    present = [count for count in counts if count is not None]
    observed = np.concatenate(present) if len(present) == len(counts) else None
    model = Model(analysis, hypothesis, coordinates, parts, overall, observed, bins, np.zeros(bins))
    return with_distortion(model)


def _with_spare(model: Model) -> Model:
    """Return the model with the events that regions give to bins which no background can fill.

    A bin that the backgrounds of one hypothesis leave empty is given them under every hypothesis, so that
    hypotheses differ in nothing but what they claim: a signal of strength 0 is background only.
    """
    wanted = [
        np.full(region.table.binning.number, region.empty_bin_events or 0.0)
        for region in model.analysis.regions
    ]
    asked = np.concatenate(wanted)
    if not asked.any():
        return model
    empty = np.zeros(model.bins, dtype=bool)
    for hypothesis in model.analysis.hypotheses:
        other = _without_spare(model.analysis, hypothesis.name)
        empty |= never_filled(other.restricted("background", spare=False))
    return replace(model, spare=np.where(empty, asked, 0.0))


def never_filled(model: Model) -> npt.NDArray[np.bool_]:
    """Return (bin,) True where the total expectation is 0 at every tried parameter value."""
    middle, _ = model.expected(model.seeds(np.zeros((1, model.size))))
    if (middle != 0.0).all():
        return np.zeros(model.bins, dtype=bool)
    spread = np.linspace(-2.0, 2.0, 5)[:, None] * np.ones(model.size)
    total, _ = model.expected(model.seeds(spread))
    return np.asarray((total == 0.0).all(axis=0))


def impossible_bins(model: Model) -> npt.NDArray[np.bool_]:
    """Return (bin,) True where events were observed that no tried parameter value can produce."""
    if model.observed is None:
        return np.zeros(model.bins, dtype=bool)
    return np.asarray(never_filled(model) & (model.observed > 0.0) & (model.spare == 0.0))
