"""Numbers with tails a little heavier than normal."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import integrate

from workbench.evidence.integral.stretching import Stretch, stretch_for


@pytest.mark.parametrize("b", [0.0, 0.05, 0.1])
def test_the_density_of_stretched_numbers_integrates_to_one(b: float) -> None:
    """Independent route: scipy's quad."""
    stretch = Stretch(b)
    total, _ = integrate.quad(
        lambda x: float(np.exp(stretch.ln_density(np.array([[x]]))[0])), -60.0, 60.0, points=[0]
    )
    assert total == pytest.approx(1.0, abs=1e-9)


@pytest.mark.parametrize("b", [0.0, 0.05, 0.1])
def test_draws_follow_the_density(b: float) -> None:
    """dx/dz from differences of the map against phi(z)/q(x)."""
    stretch, z, step = Stretch(b), np.linspace(-6.0, 6.0, 49)[:, None], 1e-5
    slope = (stretch.forward(z + step) - stretch.forward(z - step))[:, 0] / (2.0 * step)
    ln_normal = -0.5 * z[:, 0] ** 2 - 0.5 * np.log(2.0 * np.pi)
    assert stretch.ln_density(stretch.forward(z)) == pytest.approx(ln_normal - np.log(slope), abs=1e-8)


def test_a_normal_target_has_bounded_and_nearly_equal_weights() -> None:
    x = np.linspace(-12.0, 12.0, 4001)[:, None]
    for dimensions in (1, 9, 200):
        stretch = stretch_for(dimensions)
        ln_weight = -0.5 * x[:, 0] ** 2 - 0.5 * np.log(2.0 * np.pi) - stretch.ln_density(x)
        assert dimensions * ln_weight.max() < 3.0
        density = np.exp(stretch.ln_density(x))
        step = x[1, 0] - x[0, 0]
        variance = float((density * np.exp(2.0 * ln_weight)).sum() * step) - 1.0
        assert dimensions * variance < 0.06
    # The negative control: a normal proposal a tenth too narrow has weights without bound.
    narrow = -0.5 * x[:, 0] ** 2 + 0.5 * (x[:, 0] / 0.9) ** 2 + np.log(0.9)
    assert narrow.max() > 10.0
