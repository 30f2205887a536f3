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
    """

    x: Array
    dx: Array
    ddx: Array


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
    """

    local: tuple[int, ...]
    names: tuple[str, ...]
    held: Mapping[str, float]
    amplitude: Formula
    core: Formula
    fixed_core: Array | None
    fixed_amplitude: float | None

    def value(self, seeds: Seeds) -> Array:
        """Return (batch, bin) or (1, bin) events before the sources act."""
        if self.fixed_amplitude is not None and self.fixed_core is not None:
            return self.fixed_amplitude * self.fixed_core[None, :]
        arguments = self._arguments(seeds, derivatives=False)
        core = self.core(arguments).value if self.fixed_core is None else self.fixed_core
        if self.fixed_amplitude is not None:
            return np.atleast_2d(self.fixed_amplitude * core)
        return np.atleast_2d(self.amplitude(arguments).value[..., None] * core)

    def expanded(self, seeds: Seeds) -> tuple[Array, Array, Array]:
        """Return events (batch, bin) with (m, batch, bin) first and (m, m, batch, bin) second derivatives."""
        if not self.local:
            return self.value(seeds), _NO_FIRST, _NO_SECOND
        arguments = self._arguments(seeds, derivatives=True)
        if self.fixed_amplitude is not None:
            jet = self.core(arguments) * self.fixed_amplitude
        elif self.fixed_core is not None:
            jet = self.amplitude(arguments).over_bins() * self.fixed_core
        else:
            jet = self.amplitude(arguments).over_bins() * self.core(arguments)
        return np.atleast_2d(jet.value), jet.first, jet.second

    def _arguments(self, seeds: Seeds, derivatives: bool) -> dict[str, Jet]:
        """Return the parameters as jets over the local coordinates (constants without derivatives)."""
        count = len(self.local) if derivatives else 0
        values = {name: Jet.constant(value, count) for name, value in self.held.items()}
        for slot, (index, name) in enumerate(zip(self.local, self.names, strict=True)):
            x = seeds.x[index]
            if derivatives:
                values[name] = Jet.variable(x, seeds.dx[index], seeds.ddx[index], slot, count)
            else:
                values[name] = Jet.constant(x)
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
