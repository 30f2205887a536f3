"""How an integrand departs from its Gaussian: third and fourth derivatives, and a map that follows them.

In whitened coordinates y the ln integrand around its maximum is

    -y.y/2 + sum K_abc y_a y_b y_c/6 + sum K_abcd y_a y_b y_c y_d/24 + ...

The K are differences of exact Hessians over a step of the size of a standard deviation, so that they describe
the bulk and not the point.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]

_STEP = 1.5
_NEGLIGIBLE = 2e-3
_LARGEST_LOG_SCALE = 0.7


@dataclass(frozen=True, slots=True, eq=False)
class Bending:
    """Third and fourth derivatives of a ln integrand at its maximum, in whitened coordinates.

    Attributes:
        axes: (nuisance, nuisance) whitening W of the maximum, y = W (z - centre), least constrained direction
            first.
        third: (nuisance, nuisance, nuisance) K_abc.
        fourth: (nuisance, nuisance) K_aabb.
    """

    axes: Array
    third: Array
    fourth: Array

    @property
    def ln_correction(self) -> float:
        """Return what the next order adds to Laplace's ln integral.

        sum_ab K_aabb/8 + sum_b (sum_a K_aab)^2/8 + sum_abc K_abc^2/12

        Source:
            Z. Shun, P. McCullagh, Laplace approximation of high dimensional integrals, J. R. Stat. Soc. B 57
            (1995) 749; from memory. In one dimension K_4/8 + 5 K_3^2/24.
        """
        return float(sum(self._terms))

    @property
    def doubt(self) -> float:
        """Return what later orders may add: a third of the size of this one, more once it is large."""
        size = sum(abs(term) for term in self._terms)
        return float(size * (0.3 + 0.5 * min(1.0, size)))

    @property
    def _terms(self) -> tuple[float, float, float]:
        traces = np.einsum("aab->b", self.third)
        return (
            float(self.fourth.sum()) / 8.0,
            float((traces**2).sum()) / 8.0,
            float((self.third**2).sum()) / 12.0,
        )


def bending(hessians_at: Callable[[Array], Array], hessian: Array) -> Bending:
    """Return the departure from the Gaussian at a maximum.

    Args:
        hessians_at: (point, nuisance) offsets from the maximum to (point, nuisance, nuisance) Hessians there.
        hessian: (nuisance, nuisance) Hessian at the maximum; negative definite.

    Returns:
        Third and fourth derivatives in whitened coordinates.

    Source:
        None, definition; central differences of exact Hessians.
    """
    values, vectors = np.linalg.eigh(-hessian)
    size = len(values)
    outward = vectors / np.sqrt(values)
    offsets = np.concatenate([_STEP * outward.T, -_STEP * outward.T])
    around = np.swapaxes(outward, 0, 1) @ hessians_at(offsets) @ outward
    up, down = around[:size], around[size:]
    raw = (up - down) / (2.0 * _STEP)
    # K_abc found along each of its three axes: the mean is symmetric.
    third = (raw + raw.transpose(1, 2, 0) + raw.transpose(2, 0, 1)) / 3.0
    bend = np.einsum("caa->ca", up + down) + 2.0
    fourth = bend / _STEP**2
    return Bending((vectors * np.sqrt(values)).T, third, 0.5 * (fourth + fourth.T))


@dataclass(frozen=True, slots=True, eq=False)
class TriangularMap:
    """A map of standard-normal draws that follows a bend, one coordinate after the other.

    y_k = m_k(y_<k) + s_k(y_<k) e_k,  m_k = sum_(a,b<k) K_kab y_a y_b/2,  ln s_k = sum_(a<k) K_kka y_a/2,
    and e_k is stretched by exp(+-K_kkk/3) on its two sides.

    Attributes:
        third: (nuisance, nuisance, nuisance) K_abc, small entries dropped.
    """

    third: Array

    @property
    def _stretch(self) -> tuple[Array, Array]:
        own = np.clip(np.einsum("kkk->k", self.third) / 3.0, -0.5, 0.5)
        return np.exp(own), np.exp(-own)

    def forward(self, normal: Array) -> Array:
        """Return (draw, nuisance) bent draws from standard-normal ones."""
        up, down = self._stretch
        y = np.zeros_like(normal)
        for k in range(normal.shape[1]):
            mean, ln_scale = self._conditional(y, k)
            y[:, k] = mean + np.exp(ln_scale) * np.where(normal[:, k] > 0.0, up[k], down[k]) * normal[:, k]
        return y

    def inverse(self, y: Array) -> tuple[Array, Array]:
        """Return (draw, nuisance) standard-normal draws that map to y, and (draw,) ln |dy/de|."""
        up, down = self._stretch
        normal = np.zeros_like(y)
        ln_volume = np.zeros(len(y))
        for k in range(y.shape[1]):
            mean, ln_scale = self._conditional(y, k)
            offset = y[:, k] - mean
            stretch = np.where(offset > 0.0, up[k], down[k])
            normal[:, k] = offset * np.exp(-ln_scale) / stretch
            ln_volume += ln_scale + np.log(stretch)
        return normal, ln_volume

    def _conditional(self, y: Array, k: int) -> tuple[Array | float, Array | float]:
        """Return the mean and ln scale of coordinate k given those before it."""
        if k == 0 or not self.third[k, :k, : k + 1].any():
            return 0.0, 0.0
        before = y[:, :k]
        mean = 0.5 * ((before @ self.third[k, :k, :k]) * before).sum(axis=1)
        ln_scale = 0.5 * (before @ self.third[k, k, :k])
        return mean, np.clip(ln_scale, -_LARGEST_LOG_SCALE, _LARGEST_LOG_SCALE)


def following(third: Array) -> TriangularMap:
    """Return the map that follows third derivatives (nuisance, nuisance, nuisance)."""
    return TriangularMap(np.where(np.abs(third) > _NEGLIGIBLE, third, 0.0))
