"""One process in one region, ready to be evaluated for many parameter values at once.

Expected events of a part in bin i:

    T_i = amplitude(x) core_i(x) exp( sum over sources of [ l_ik z_k + q_ik g(z_k) ] )

with l = (u - d)/2, q = (u + d)/2, u and d the ln factors of the source at z = +1 and -1, and g the smooth
even curve of `hypotheses.uncertainties`. Sources whose effect is the same in all bins are kept for all parts
together (`Sources`), the others with their part.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from workbench.hypotheses.jets import Jet
from workbench.hypotheses.uncertainties import curvature

Array = npt.NDArray[np.float64]
Indices = npt.NDArray[np.intp]
Formula = Callable[[Mapping[str, Jet]], Jet]

_LARGEST_EXPONENT = 230.0


@dataclass(frozen=True, slots=True)
class Seeds:
    """Values of every coordinate's parameter with derivatives in the coordinates in force.

    Attributes:
        x, dx, ddx: (coordinate, batch) the value and its first two derivatives.
        still: parameters whose derivatives nobody asks for: none are made, so that theirs come out as 0.
    """

    x: Array
    dx: Array
    ddx: Array
    still: frozenset[int] = frozenset()

    def moving(self, coordinates: tuple[int, ...]) -> tuple[int, ...]:
        """Return those of some coordinates whose derivatives are asked for."""
        if not self.still:
            return coordinates
        return tuple(index for index in coordinates if index not in self.still)

    def runs(self, coordinates: tuple[int, ...]) -> tuple[Seeds, Indices | None]:
        """Return seeds with points left out that repeat the one before in some coordinates.

        Returns:
            The seeds, and how often each of their points stands in a row; None where none repeats.
        """
        if not coordinates or self.x.shape[1] < 2:
            return self, None
        chosen = self.x[list(coordinates)]
        starts = np.flatnonzero(np.append(True, (chosen[:, 1:] != chosen[:, :-1]).any(axis=0)))
        if 2 * starts.size > self.x.shape[1]:
            return self, None
        return Seeds(self.x[:, starts], self.dx[:, starts], self.ddx[:, starts], self.still), np.diff(
            starts, append=self.x.shape[1]
        )


@dataclass(frozen=True, slots=True, eq=False)
class Sources:
    """The ln factors of sources: z @ linear + g(z) @ bend, for several rows (parts, or bins of one part).

    Attributes:
        indices: (source,) coordinate indices.
        linear, bend: (source, row) coefficients l and q.
        is_bent: True when some q is not 0.
    """

    indices: Indices
    linear: Array
    bend: Array
    is_bent: bool

    def factors(self, x: Array) -> Array:
        """Return the (batch, row) product of the sources' factors at (coordinate, batch) values."""
        z = x[self.indices]
        exponent = z.T @ self.linear
        if self.is_bent:
            exponent += curvature(z).value.T @ self.bend
        return _power(exponent)

    def expanded(self, x: Array) -> tuple[Array, Array, Array]:
        """Return factors (batch, row) with slopes and bends (batch, source, row) of their ln in each z."""
        z = x[self.indices]
        if not self.is_bent:
            slopes = np.broadcast_to(self.linear, (x.shape[1], *self.linear.shape))
            return _power(z.T @ self.linear), slopes, np.zeros((1, 1, 1))
        g, first, second = curvature(z)
        factors = _power(z.T @ self.linear + g.T @ self.bend)
        slopes = self.linear + first.T[:, :, None] * self.bend
        return factors, slopes, second.T[:, :, None] * self.bend

    def pulls(self, x: Array, weighted: Array) -> Array:
        """Return (batch, source) sums over rows of (batch, row) weights times slopes of the ln factors."""
        pulled = weighted @ self.linear.T
        if self.is_bent:
            pulled = pulled + curvature(x[self.indices]).first.T * (weighted @ self.bend.T)
        return np.asarray(pulled)


def _power(exponent: Array) -> Array:
    """Return e to the power, held at a huge number whose square, times a count, is still finite."""
    return np.asarray(np.exp(np.minimum(exponent, _LARGEST_EXPONENT)))


_NO_FIRST, _NO_SECOND = np.zeros((0, 1, 1)), np.zeros((0, 0, 1, 1))


@dataclass(frozen=True, slots=True, eq=False)
class Stem:
    """Amplitude times core of a part, or of its template's error: all but the sources.

    Attributes:
        local: coordinate indices it depends on.
        names: the names those coordinates have.
        held: parameters held at a number.
        amplitude: yield times factors.
        core: (..., bin) shape integrals or template; (bin,) where it depends on nothing.
        fixed_core: (bin,) the core where it depends on nothing, else None.
        fixed_amplitude: the amplitude where it depends on nothing, else None.
        shaping: coordinate indices the core depends on.
    """

    local: tuple[int, ...]
    names: tuple[str, ...]
    held: Mapping[str, float]
    amplitude: Formula
    core: Formula
    fixed_core: Array | None
    fixed_amplitude: float | None
    shaping: tuple[int, ...]

    def value(self, seeds: Seeds, factor: Array | float = 1.0) -> Array:
        """Return (batch, bin) events, or (1, bin) where nothing moves them, times the sources' factor."""
        if self.fixed_amplitude is not None:
            return np.atleast_2d((factor * self.fixed_amplitude) * self._core(seeds))
        amplitude = self.amplitude(self._arguments(seeds)).value[..., None]
        return np.atleast_2d((factor * amplitude) * self._core(seeds))

    def _core(self, seeds: Seeds) -> Array:
        """Return the (batch, bin) core, or one for all; worked out once for points in a row that share it."""
        if self.fixed_core is not None:
            return self.fixed_core
        distinct, times = seeds.runs(self.shaping)
        core = self.core(self._arguments(distinct)).value
        return core if times is None or core.ndim < 2 else np.repeat(core, times, axis=0)

    def expanded(self, seeds: Seeds, local: tuple[int, ...], factor: Array) -> tuple[Array, Array, Array]:
        """Return events (batch, bin) with their derivatives in m coordinates.

        Args:
            seeds: (coordinate, batch) parameter values with derivatives.
            local: those of the stem's coordinates in which derivatives are wanted.
            factor: (batch, 1) or (batch, bin) the sources' factor.

        Returns:
            Events, (m, batch, bin) first and (m, m, batch, bin) second derivatives.
        """
        if not local:
            return self.value(seeds, factor), _NO_FIRST, _NO_SECOND
        arguments = self._arguments(seeds, local)
        if self.fixed_amplitude is not None:
            jet, factor = self.core(arguments), factor * self.fixed_amplitude
        elif not any(index in local for index in self.shaping):
            jet = self.amplitude(arguments).over_bins() * self._core(seeds)
        else:
            jet = self.amplitude(arguments).over_bins() * self.core(arguments)
        events, count = factor * np.atleast_2d(jet.value), len(local)
        first = np.broadcast_to(factor * jet.first, (count, *events.shape))
        return events, first, np.broadcast_to(factor * jet.second, (count, count, *events.shape))

    def _arguments(self, seeds: Seeds, local: tuple[int, ...] = ()) -> dict[str, Jet]:
        """Return the parameters as jets over some of the local coordinates, as constants in the others."""
        count = len(local)
        values = {name: Jet.constant(value, count) for name, value in self.held.items()}
        for index, name in zip(self.local, self.names, strict=True):
            x = seeds.x[index]
            if index in local:
                slot = local.index(index)
                values[name] = Jet.variable(x, seeds.dx[index], seeds.ddx[index], slot, count)
            else:
                values[name] = Jet.constant(x, count)
        return values


@dataclass(frozen=True, slots=True, eq=False)
class Part:
    """One process in one region.

    Attributes:
        process: the process' name.
        bins: where its region stands among all bins.
        stem: amplitude times core.
        error: amplitude times one standard deviation of the template's statistics; None if it has none.
        by_bin: sources that act differently in different bins; None without any.
    """

    process: str
    bins: slice
    stem: Stem
    error: Stem | None
    by_bin: Sources | None
