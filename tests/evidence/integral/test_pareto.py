"""The tail shape of weights whose tail is known."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from workbench.evidence.integral.pareto import k_hat, largest_allowed


def spread_of_k(shape: float, draws: int) -> float:
    """Return the standard deviation of a shape from the largest 3 sqrt(N) of N draws: (1 + k)/sqrt(tail).

    R.L. Smith, Biometrika 72 (1985) 67, large-sample variance (1 + k)^2/n; from memory.
    """
    return (1.0 + shape) / float(np.sqrt(3.0 * np.sqrt(draws)))


@pytest.mark.parametrize("shape", [0.1, 0.3, 0.5, 0.7, 1.0, 1.5])
def test_the_shape_of_pareto_weights_is_found(shape: float) -> None:
    """Weights u**-k of a uniform u are Pareto with tail index 1/k, so that their shape is k."""
    draws, repeats = 10_000, 60
    uniform = np.random.default_rng(11).random((repeats, draws))
    found = np.array([k_hat(-shape * np.log(row)) for row in uniform])
    # The fit pulls shapes a little towards 1/2, by 10 draws' worth of the 300 in the tail.
    pulled = shape + 10.0 / 310.0 * (0.5 - shape)
    error = spread_of_k(shape, draws) / np.sqrt(repeats)
    assert abs(found.mean() - pulled) < 4.0 * error + 0.02
    assert 0.6 < found.std() / spread_of_k(shape, draws) < 1.4


def test_another_shape_is_told_apart() -> None:
    """The negative control: weights of shape 0.9 are not taken for shape 0.5."""
    uniform = np.random.default_rng(11).random((60, 10_000))
    found = np.array([k_hat(-0.9 * np.log(row)) for row in uniform])
    assert found.min() > 0.5
    assert found.mean() - 0.5 > 10.0 * spread_of_k(0.9, 10_000) / np.sqrt(60)


def test_generalised_pareto_draws_of_a_reference_library_keep_their_shape() -> None:
    """scipy.stats.genpareto, shape c: far above its threshold its tail is a Pareto tail of the same shape."""
    draws = stats.genpareto(0.4).rvs(size=(60, 10_000), random_state=np.random.default_rng(3))
    found = np.array([k_hat(np.log(row)) for row in draws])
    assert abs(found.mean() - 0.4) < 4.0 * spread_of_k(0.4, 10_000) / np.sqrt(60) + 0.02


def test_light_tails_have_a_shape_of_about_zero_and_bounded_weights_a_negative_one() -> None:
    generator = np.random.default_rng(4)
    exponential = [k_hat(np.log(row)) for row in generator.exponential(size=(40, 4000))]
    assert abs(np.mean(exponential)) < 0.1
    bounded = [k_hat(np.log(row)) for row in generator.random((40, 4000))]
    assert np.mean(bounded) < -0.5


def test_equal_weights_have_no_tail_at_all() -> None:
    assert k_hat(np.full(1000, -300.0)) == float("-inf")


def test_the_shape_does_not_depend_on_the_unit_of_the_weights() -> None:
    ln_weights = -0.6 * np.log(np.random.default_rng(8).random(2000))
    assert k_hat(ln_weights) == pytest.approx(k_hat(ln_weights - 4000.0), abs=1e-9)


def test_one_weight_that_has_all_is_seen() -> None:
    ln_weights = np.zeros(1000) + 1e-3 * np.random.default_rng(8).standard_normal(1000)
    ln_weights[17] = 40.0
    assert k_hat(ln_weights) > 0.7


@pytest.mark.parametrize(("draws", "allowed"), [(100, 0.5), (1000, 2.0 / 3.0), (2154, 0.7), (1_000_000, 0.7)])
def test_the_largest_shape_allowed_is_that_of_the_printed_rule(draws: int, allowed: float) -> None:
    """By hand: min(1 - 1/log10 N, 0.7): 1 - 1/2 at 100, 1 - 1/3 at 1000, 0.7 from 10**(10/3) = 2154 on."""
    assert largest_allowed(draws) == pytest.approx(allowed, abs=1e-4)
