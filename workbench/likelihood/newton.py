"""Batched Newton maximisation inside a box, with exact derivatives."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from workbench.likelihood.objective import Objective

Array = npt.NDArray[np.float64]
Flags = npt.NDArray[np.bool_]
Indices = npt.NDArray[np.intp]

_LONGEST_STEP = 4.0
_LARGEST = 1e150  # beyond it the eigenvalues' iteration fails


@dataclass(frozen=True, slots=True, eq=False)
class Maxima:
    """Where a batch of maximisations ended.

    Attributes:
        points: (batch, coordinate) best points.
        values: (batch,) what was maximised there [nats].
        gains: (batch,) what one more Newton step promises [nats]; small where converged.
        gradients: (batch, coordinate) its gradient.
        hessians: (batch, coordinate, coordinate) its Hessian, held coordinates included.
        converged: (batch,) True where the expected further gain is below the tolerance.
        evaluations: how often derivatives were worked out, all rows together.
    """

    points: Array
    values: Array
    gains: Array
    gradients: Array
    hessians: Array
    converged: Flags
    evaluations: int


def maximise(
    objective: Objective,
    start: Array,
    counts: Array,
    *,
    moving: Flags | None = None,
    tolerance: float = 1e-7,
    most: int = 60,
    scale: Array | None = None,
    go_on: bool = False,
) -> Maxima:
    """Return the maxima reached from a batch of starting points.

    Each iteration solves -H step = gradient over the coordinates that move and are not pressed against the
    end of their range; where -H is not positive definite its eigenvalues are made so. A step that lowers the
    value is shortened until it does not. The expected further gain gradient.step/2 decides when to stop.

    Args:
        objective: what is maximised.
        start: (batch, coordinate) starting points.
        counts: (bin,) or (batch, bin) counted events [events].
        moving: (coordinate,) or (batch, coordinate) which coordinates may move; all by default.
        tolerance: expected further gain at which a point is final [nats].
        most: iterations at the most.
        scale: (coordinate,) a length for each coordinate, to bound steps; 1 by default.
        go_on: True takes the last promised step too, without evaluating there; values, gradients and Hessians
            are those before it.

    Returns:
        The maxima; a point that did not converge is the best one found.
    """
    box = _Box.around(objective, start, moving, scale)
    points = np.clip(start, box.low, box.high)
    values, gradients, hessians = objective.derivatives(points, counts)
    shrink, evaluations = np.ones(len(points)), len(points)
    steps, gain = _steps(box, points, gradients, hessians)
    converged = (gain <= tolerance) & np.isfinite(values)
    active = np.flatnonzero((gain > tolerance) & steps.any(axis=1))
    for _ in range(most):
        if active.size == 0:
            break
        wanted = points[active] + shrink[active, None] * steps[active]
        trial = np.clip(wanted, box.low, box.high)
        rows = counts if counts.ndim == 1 else counts[active]
        value, gradient, hessian = objective.derivatives(trial, rows)
        evaluations += len(trial)
        better = value >= values[active] - 1e-10 * (1.0 + np.abs(values[active]))
        worse = active[~better]
        shrink[worse] *= 0.3
        moved = active[better]
        points[moved], values[moved] = trial[better], value[better]
        gradients[moved], hessians[moved] = gradient[better], hessian[better]
        shrink[moved] = 1.0
        if moved.size:
            steps[moved], gain[moved] = _steps(
                box.of(moved), points[moved], gradients[moved], hessians[moved]
            )
        converged[moved] = (gain[moved] <= tolerance) & np.isfinite(values[moved])
        active = active[~converged[active] & (shrink[active] > 1e-9) & steps[active].any(axis=1)]
    if go_on:
        points = np.where(converged[:, None], np.clip(points + steps, box.low, box.high), points)
    gains = np.where(converged, gain, 0.0)
    return Maxima(points, values, gains, gradients, hessians, converged, evaluations)


@dataclass(frozen=True, slots=True, eq=False)
class _Box:
    """Where points may go.

    Attributes:
        low, high: (coordinate,) ends of the allowed box.
        free: indices of the coordinates that move in any row.
        held: (batch, free) True where a row holds one of these; None where none does.
        unit: (coordinate,) a length for each coordinate.
    """

    low: Array
    high: Array
    free: Indices
    held: Flags | None
    unit: Array

    @classmethod
    def around(cls, objective: Objective, start: Array, moving: Flags | None, scale: Array | None) -> _Box:
        """Return the box of an objective for a batch of starting points."""
        size = start.shape[1]
        held = None
        free = np.arange(size)
        if moving is not None:
            free = np.flatnonzero(moving if moving.ndim == 1 else moving.any(axis=0))
            held = None if moving.ndim == 1 else ~moving[:, free]
        unit = np.ones(size) if scale is None else scale
        return cls(objective.low, objective.high, free, held, unit)

    def of(self, rows: Indices) -> _Box:
        """Return the box of some rows."""
        return self if self.held is None else replace(self, held=self.held[rows])


def _steps(box: _Box, points: Array, gradients: Array, hessians: Array) -> tuple[Array, Array]:
    """Return (batch, coordinate) Newton steps and the (batch,) gain each promises."""
    steps = np.zeros_like(points)
    free = box.free
    if free.size == 0:
        return steps, np.zeros(len(points))
    low, high, unit = box.low[free], box.high[free], box.unit[free]
    gradient, curvature = gradients[:, free], -hessians[:, free[:, None], free[None, :]]
    if not (np.isfinite(gradient).all() and np.isfinite(curvature).all()):
        gradient, curvature = np.nan_to_num(gradient), np.nan_to_num(curvature)
    at = points[:, free]
    pressed = ((at <= low) & (gradient < 0.0)) | ((at >= high) & (gradient > 0.0))
    if box.held is not None:
        pressed |= box.held
    gradient = np.where(pressed, 0.0, gradient)
    if pressed.any():
        keep = ~pressed
        curvature = curvature * keep[:, :, None] * keep[:, None, :]
        diagonal = np.arange(free.size)
        curvature[:, diagonal, diagonal] += np.where(pressed, 1.0 / unit**2, 0.0)
    step = solve_definite(curvature, gradient, unit)
    is_lost = ~np.isfinite(step).all(axis=1)
    step[is_lost] = 0.0
    longest = np.abs(step / unit).max(axis=1)
    step *= np.minimum(1.0, _LONGEST_STEP / np.maximum(longest, 1e-300))[:, None]
    steps[:, free] = step
    reach = np.clip(at + step, low, high) - at
    gain = np.maximum(
        0.5 * np.einsum("na,na->n", gradient, step), 0.5 * np.einsum("na,na->n", gradient, reach)
    )
    return steps, np.where(np.isfinite(gain) & ~is_lost, gain, np.inf)


def solve_definite(matrices: Array, vectors: Array, unit: Array) -> Array:
    """Solve symmetric systems, making a matrix positive definite by its eigenvalues where it is not.

    Args:
        matrices: (batch, coordinate, coordinate) symmetric matrices.
        vectors: (batch, coordinate) right-hand sides.
        unit: (coordinate,) a length for each coordinate, which sets what a small eigenvalue is.

    Returns:
        (batch, coordinate) solutions; nan for a matrix with nan.
    """
    scaled = matrices * unit[:, None] * unit[None, :]
    right = vectors * unit
    try:
        np.linalg.cholesky(scaled)
        return np.linalg.solve(scaled, right[..., None])[..., 0] * unit
    except np.linalg.LinAlgError:
        usable = np.asarray(np.isfinite(scaled).all(axis=(1, 2)))
        bounded = np.where(usable[:, None, None], scaled, np.eye(len(unit)))
        values, axes = np.linalg.eigh(np.clip(bounded, -_LARGEST, _LARGEST))
        right = np.where(usable[:, None], right, np.nan)
        floor = 1e-10 * np.maximum(np.abs(values).max(axis=1, keepdims=True), 1e-6)
        values = np.maximum(np.abs(values), floor)
        inner = np.einsum("nab,na->nb", axes, right) / values
        return np.asarray(np.einsum("nab,nb->na", axes, inner) * unit)
