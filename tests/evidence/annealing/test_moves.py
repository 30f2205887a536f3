"""Each move leaves its target as it is, whatever the rung says; and away from it, it moves towards it."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import numpy.typing as npt
import pytest

from tests.evidence.gaussian_terrains import bells
from workbench.evidence.annealing import moves
from workbench.evidence.annealing.cloud import cloud
from workbench.evidence.annealing.marginals import marginals
from workbench.evidence.annealing.moves import CHOICES, CYCLE, Chains, Dice, Rung, Terrain, step

Array = npt.NDArray[np.float64]

SIZE, BETA, SD, CENTRE = 2, 0.6, 0.5, 0.8
POPULATIONS, CHAINS = 4, 4000
# L^beta N(0, 1) is a normal law again: precisions add.
PRECISION = BETA / SD**2 + 1.0
MEAN = BETA * CENTRE / SD**2 / PRECISION


def clumsy_rung(generator: np.random.Generator) -> Rung:
    """Return a rung made from points of quite another law."""
    points = 0.4 + 0.9 * generator.standard_normal((500, SIZE))
    points[:, 1] += 0.5 * points[:, 0]
    root = np.linalg.cholesky(np.cov(points.T)).astype(np.float64)
    own = marginals(points, np.full(500, 1.0 / 500.0))
    clouds = (cloud(points, np.arange(SIZE)),)
    return Rung(
        BETA,
        points.mean(axis=0),
        root,
        np.linalg.inv(root).astype(np.float64),
        points,
        own,
        clouds,
        (0.6, 0.8),
        1,
    )


def moved(kind: str, mean: float, steps: int = 8) -> tuple[Array, float]:
    """Return points that began as draws around a mean, after some steps, and the last acceptance."""
    generator = np.random.default_rng(29)
    terrain: Terrain = bells(SIZE, (1.0, CENTRE, SD))[0]
    rung = clumsy_rung(generator)
    shape = (POPULATIONS, CHAINS, SIZE)
    points = mean + generator.standard_normal(shape) / np.sqrt(PRECISION)
    chains, accepted = Chains(points, terrain.evaluated(points)), 0.0
    for _ in range(steps):
        uniform = generator.random((*shape[:2], SIZE + CHOICES))
        dice = Dice(generator.standard_normal(shape), uniform[..., :SIZE], uniform[..., SIZE:], 0)
        chains, accepted = step(kind, chains, dice, rung, terrain)
    return chains.points.reshape(-1, SIZE), accepted


def deviations(points: Array) -> Array:
    """Return how far the first two moments are from the target's, in standard errors."""
    scaled = (points - MEAN) * np.sqrt(PRECISION)
    root = np.sqrt(len(points))
    return np.concatenate(
        [
            scaled.mean(axis=0) * root,
            (scaled.var(axis=0) - 1.0) * root / np.sqrt(2.0),
            [(scaled[:, 0] * scaled[:, 1]).mean() * root],
        ]
    )


@pytest.mark.parametrize("kind", sorted(set(CYCLE)))
def test_a_move_keeps_its_target(kind: str) -> None:
    points, accepted = moved(kind, MEAN)
    assert 0.01 < accepted < 0.99
    assert np.abs(deviations(points)).max() < 5.0


@pytest.mark.parametrize("kind", sorted(set(CYCLE)))
def test_a_move_brings_what_is_elsewhere_nearer_to_its_target(kind: str) -> None:
    """The negative control of the test above: what is not the target does not stay as it is."""
    began = MEAN - 1.0
    points, _ = moved(kind, began, steps=3)
    assert np.abs(deviations(points)).max() > 5.0
    before, after = abs(began - MEAN), np.abs(points.mean(axis=0) - MEAN)
    assert (after < before - 0.01).all()


@pytest.mark.parametrize("kind", ["follow", "redraw", "visit"])
def test_a_proposal_whose_own_density_is_forgotten_would_be_seen(
    kind: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    fair = moves._PROPOSALS[kind]

    def careless(points: Array, dice: Dice, rung: Rung, terrain: Terrain) -> tuple[Array, Array]:
        proposed, _ = fair(points, dice, rung, terrain)
        return proposed, np.zeros(points.shape[:2])

    monkeypatch.setitem(moves._PROPOSALS, kind, careless)
    assert np.abs(deviations(moved(kind, MEAN)[0])).max() > 5.0


def test_sizes_grow_where_too_much_is_accepted_and_shrink_where_too_little_is() -> None:
    grown = moves.adapted((0.5, 0.5), {"follow": 0.9, "stride": 0.9})
    shrunk = moves.adapted((0.5, 0.5), {"follow": 0.0, "stride": 0.0})
    assert min(grown) > 0.5 > max(shrunk)
    assert moves.adapted((0.98, 2.0), {"follow": 1.0, "stride": 1.0}) == (0.98, 2.0)


def test_a_move_to_where_nothing_is_possible_is_refused() -> None:
    generator = np.random.default_rng(3)
    rung = clumsy_rung(generator)
    terrain = replace(
        bells(SIZE, (1.0, 0.0, 1.0))[0], ln_likelihood=lambda x: np.where(x[:, 0] > 0.0, 0.0, np.nan)
    )
    points = np.abs(generator.standard_normal((1, 200, SIZE)))
    dice = Dice(
        generator.standard_normal((1, 200, SIZE)),
        generator.random((1, 200, SIZE)),
        generator.random((1, 200, CHOICES)),
        0,
    )
    for kind in CYCLE:
        chains, _ = step(kind, Chains(points, terrain.evaluated(points)), dice, rung, terrain)
        assert (chains.points[..., 0] > 0.0).all()
