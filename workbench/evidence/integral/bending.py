"""How an integrand departs from its Gaussian: third and fourth derivatives, and a map that follows them.

In whitened coordinates y the ln integrand around its maximum is

    -y.y/2 + sum K_abc y_a y_b y_c/6 + sum K_abcd y_a y_b y_c y_d/24 + ...

The K are differences of exact Hessians over a step of the size of a standard deviation, so that they describe
the bulk and not the point.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt
from scipy import special

from workbench.evidence.integral.ridge import Ridge

Array = npt.NDArray[np.float64]

_STEP = 1.5
_NEGLIGIBLE = 0.02
_BEYOND = 0.55
_LARGEST_LOG_SCALE = 0.7
_MOST_BENT = 12  # directions of which all pairs are looked at


@dataclass(frozen=True, slots=True, eq=False)
class Bending:
    """Third and fourth derivatives of a ln integrand at its maximum, in whitened coordinates.

    Attributes:
        axes: (nuisance, nuisance) whitening W of the maximum, y = W (z - centre), least constrained direction
            first.
        third: (nuisance, nuisance, nuisance) K_abc.
        fourth: (nuisance, nuisance) K_aabb.
        ridge: nodes along the first direction, where third derivatives do not describe it; else None.
        is_partial: True where most derivatives of three different directions, and the mixed fourth ones, are
            not known and left at 0.
    """

    axes: Array
    third: Array
    fourth: Array
    ridge: Ridge | None = None
    is_partial: bool = False

    @property
    def outward(self) -> Array:
        """Return the inverse of the whitening."""
        return np.asarray(np.linalg.inv(self.axes))

    @property
    def bent_most(self) -> int:
        """Return the direction whose ridge curves, leans or is pointed most."""
        return int(np.argmax(self._bends + np.abs(np.diag(self.fourth))))

    @property
    def is_beyond_third_order(self) -> bool:
        """Return True where third derivatives describe the most bent direction poorly."""
        return bool(self._bends.max() > _BEYOND)

    @property
    def _bends(self) -> Array:
        return np.asarray(np.sqrt(np.einsum("jjk,jjk->j", self.third, self.third)))

    def led_by(self, direction: int) -> Bending:
        """Return the same with one direction moved to the front."""
        order = np.array([direction, *(i for i in range(len(self.axes)) if i != direction)])
        third = self.third[np.ix_(order, order, order)]
        fourth = self.fourth[np.ix_(order, order)]
        return replace(self, axes=self.axes[order], third=third, fourth=fourth)

    @property
    def ln_correction(self) -> float:
        """Return what the next order adds to Laplace's ln integral.

        sum_ab K_aabb/8 + sum_b (sum_a K_aab)^2/8 + sum_abc K_abc^2/12

        Source:
            Z. Shun, P. McCullagh, Laplace approximation of high dimensional integrals, J. R. Stat. Soc. B 57
            (1995) 749; from memory. In one dimension K_4/8 + 5 K_3^2/24.
        """
        along = 0.0 if self.ridge is None else self.ridge.ln_correction
        return along if self.is_partial else along + float(sum(self._terms))

    @property
    def doubt(self) -> float:
        """Return what later orders may add: a third of the size of this one, more once it is large.

        Where this one is not known in full, its parts mostly cancel, and Laplace stands without.
        """
        size = sum(abs(term) for term in self._terms)
        if self.is_partial:
            return 0.3 * size
        along = 0.0 if self.ridge is None else self.ridge.error
        return along + float(size * (0.3 + 0.5 * min(1.0, size)))

    @property
    def _terms(self) -> tuple[float, float, float]:
        first = 0 if self.ridge is None else 1  # what runs along the ridge is integrated there
        third, fourth = self.third[first:, first:, first:], self.fourth[first:, first:]
        traces = np.einsum("aab->b", third)
        return (
            float(fourth.sum()) / 8.0,
            float((traces**2).sum()) / 8.0,
            float((third**2).sum()) / 12.0,
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


def partial_bending(gradients_at: Callable[[Array], Array], hessian: Array) -> Bending:
    """Return as much of the departure at a maximum as gradients tell, for when Hessians cost too much.

    Second differences of gradients along a direction j are K_jjk for all k. Among the directions that bend
    most, differences along their sums give K_abk too:

        K_(a+b)(a+b)k = K_aak + K_bbk + 2 K_abk

    Args:
        gradients_at: (point, nuisance) offsets from the maximum to (point, nuisance) gradients there.
        hessian: (nuisance, nuisance) Hessian at the maximum; negative definite.

    Returns:
        What is known of the third and fourth derivatives in whitened coordinates.

    Source:
        None, definition; central differences of exact gradients.
    """
    values, vectors = np.linalg.eigh(-hessian)
    size = len(values)
    outward = vectors / np.sqrt(values)

    def differences(directions: Array) -> tuple[Array, Array]:
        offsets = _STEP * directions @ outward.T
        around = gradients_at(np.concatenate([offsets, -offsets])) @ outward
        up, down = around[: len(directions)], around[len(directions) :]
        return (up + down) / _STEP**2, (up - down) / (2.0 * _STEP)

    squares, slopes = differences(np.eye(size))
    third = np.zeros((size, size, size))
    each = np.arange(size)
    third[each, each, :] = third[each, :, each] = squares
    third[:, each, each] = squares.T
    fourth = np.diag(6.0 / _STEP**2 * (np.diag(slopes) + 1.0))
    bends = np.sqrt((squares**2).sum(axis=0) + (squares**2).sum(axis=1))
    chosen = np.argsort(bends)[::-1][:_MOST_BENT]
    a, b = (index[np.triu_indices(chosen.size, 1)] for index in np.meshgrid(chosen, chosen, indexing="ij"))
    pairs = np.zeros((a.size, size))
    pairs[np.arange(a.size), a] = pairs[np.arange(a.size), b] = 1.0
    mixed = 0.5 * (differences(pairs)[0] - squares[a] - squares[b])
    for one, other in ((a, b), (b, a)):
        third[one, other, :] = third[one, :, other] = mixed
        third[:, one, other] = mixed.T
    return Bending((vectors * np.sqrt(values)).T, third, fourth, is_partial=True)


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
            if not self._is_bent(k):
                y[:, k] = normal[:, k]
                continue
            mean, ln_scale = self._conditional(y, k)
            y[:, k] = mean + np.exp(ln_scale) * np.where(normal[:, k] > 0.0, up[k], down[k]) * normal[:, k]
        return y

    def inverse(self, y: Array) -> tuple[Array, Array]:
        """Return (draw, nuisance) standard-normal draws that map to y, and (draw,) ln |dy/de|."""
        up, down = self._stretch
        normal = np.zeros_like(y)
        ln_volume = np.zeros(len(y))
        for k in range(y.shape[1]):
            if not self._is_bent(k):
                normal[:, k] = y[:, k]
                continue
            mean, ln_scale = self._conditional(y, k)
            offset = y[:, k] - mean
            stretch = np.where(offset > 0.0, up[k], down[k])
            normal[:, k] = offset * np.exp(-ln_scale) / stretch
            ln_volume += ln_scale + np.log(stretch)
        return normal, ln_volume

    def _is_bent(self, k: int) -> bool:
        return bool(self.third[k, : k + 1, : k + 1].any())

    def _conditional(self, y: Array, k: int) -> tuple[Array | float, Array | float]:
        """Return the mean and ln scale of coordinate k given those before it."""
        relevant = np.flatnonzero(self.third[k, :k, : k + 1].any(axis=1))
        if relevant.size == 0:
            return 0.0, 0.0
        before = y[:, relevant]
        mean = 0.5 * ((before @ self.third[k, relevant[:, None], relevant]) * before).sum(axis=1)
        ln_scale = 0.5 * (before @ self.third[k, k, relevant])
        return mean, np.clip(ln_scale, -_LARGEST_LOG_SCALE, _LARGEST_LOG_SCALE)


@dataclass(frozen=True, slots=True, eq=False)
class RidgeMap:
    """A map of standard-normal draws that follows a ridge, and the bends across it.

    Attributes:
        ridge: nodes along the first coordinate.
        rest: the map of the other coordinates, around the ridge.
    """

    ridge: Ridge
    rest: TriangularMap

    def forward(self, normal: Array) -> Array:
        """Return (draw, nuisance) whitened draws from standard-normal ones."""
        position = self.ridge.place(special.ndtr(normal[:, 0]))
        centre, root = self.ridge.across(position)
        offset = np.linalg.solve(root, self.rest.forward(normal[:, 1:])[..., None])[..., 0]
        return np.concatenate([position[:, None], centre + offset], axis=1)

    def inverse(self, y: Array) -> tuple[Array, Array]:
        """Return (draw, nuisance) standard-normal draws that map to y, and (draw,) ln |dy/de|."""
        share, density = self.ridge.share(y[:, 0])
        along = special.ndtri(np.clip(share, 1e-300, 1.0 - 1e-16))
        centre, root = self.ridge.across(y[:, 0])
        across = (root @ (y[:, 1:] - centre)[..., None])[..., 0]
        normal, ln_volume = self.rest.inverse(across)
        ln_density = np.log(np.maximum(density, 1e-300))
        ln_volume = ln_volume - np.log(np.einsum("naa->na", root)).sum(axis=1)
        ln_volume += -0.5 * along**2 - 0.5 * np.log(2.0 * np.pi) - ln_density
        return np.concatenate([along[:, None], normal], axis=1), ln_volume


def following(third: Array, ridge: Ridge | None = None) -> TriangularMap | RidgeMap:
    """Return the map that follows (nuisance, nuisance, nuisance) third derivatives, and perhaps a ridge."""
    kept = np.where(np.abs(third) > _NEGLIGIBLE, third, 0.0)
    if ridge is None:
        return TriangularMap(kept)
    return RidgeMap(ridge, TriangularMap(kept[1:, 1:, 1:]))
