"""Third and fourth derivatives of an integrand, the correction they give, and the map that follows them."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import numpy.typing as npt
import pytest
from scipy import special

from workbench.evidence.integral.bending import Bending, bending, following, partial_bending

Array = npt.NDArray[np.float64]

TURN = np.array([[0.6, -0.8, 0.0], [0.48, 0.36, -0.8], [0.64, 0.48, 0.6]])
STRETCH = np.array([[2.0, 0.3, 0.0], [0.0, 0.5, -0.1], [0.0, 0.0, 1.0]])


def cubic(generator: np.random.Generator, size: int, scale: float) -> Array:
    """Return a random symmetric tensor of third derivatives."""
    raw = generator.normal(scale=scale, size=(size,) * 3)
    orders = [(0, 1, 2), (0, 2, 1), (1, 0, 2), (1, 2, 0), (2, 0, 1), (2, 1, 0)]
    return np.asarray(np.mean([raw.transpose(order) for order in orders], axis=0))


def log_gammas(shapes: Array, mixing: Array) -> tuple[Callable[[Array], Array], Array, float, float]:
    """Return independent rates seen in mixed-up log coordinates z = M ln x, around their joint maximum.

    With y = ln x the ln integrand is a y - exp(y), whose maximum is at ln a and whose integral is Gamma(a).

    Returns:
        Hessians at offsets, the Hessian at the maximum, Laplace's ln integral and the exact one (in y).
    """
    back = np.linalg.inv(mixing)

    def hessians_at(offsets: Array) -> Array:
        diagonal = -shapes * np.exp(offsets @ back.T)
        return np.asarray(np.einsum("ka,nk,kb->nab", back, diagonal, back))

    hessian = hessians_at(np.zeros((1, shapes.size)))[0]
    laplace = float((shapes * np.log(shapes) - shapes + 0.5 * np.log(2.0 * np.pi / shapes)).sum())
    return hessians_at, hessian, laplace, float(special.gammaln(shapes).sum())


def polynomial(third: Array, fourth: Array) -> Callable[[Array], Array]:
    """Return Hessians of -y.y/2 + K_abc y y y/6 + sum_ab Q_ab y_a^2 y_b^2/4 at offsets, Q symmetric."""

    def hessians_at(y: Array) -> Array:
        along = (
            2.0 * fourth * y[:, :, None] * y[:, None, :] + np.eye(len(third)) * (y**2 @ fourth)[:, None, :]
        )
        return np.asarray(-np.eye(len(third)) + np.einsum("abc,nc->nab", third, y) + along)

    return hessians_at


def test_derivatives_of_a_polynomial_of_fourth_degree_are_exact() -> None:
    """By hand, from the polynomial: K_aabb = 2 Q_ab and K_aaaa = 6 Q_aa.

    The axes come in the order of their variances and with any sign.
    """
    third = cubic(np.random.default_rng(1), 3, 0.2)
    fourth = np.array([[-0.2, 0.05, 0.0], [0.05, -0.3, 0.1], [0.0, 0.1, -0.1]])
    variances = np.array([1.0, 1.0 + 1e-9, 1.0 + 2e-9])
    found = bending(polynomial(third, fourth), -np.diag(1.0 / variances))
    place = np.argmax(np.abs(found.axes), axis=1)
    sign = found.axes[np.arange(3), place].round()
    mixed = third[np.ix_(place, place, place)] * sign[:, None, None] * sign[:, None] * sign
    assert found.third == pytest.approx(mixed, abs=1e-7)
    expected = 2.0 * fourth + 4.0 * np.diag(np.diag(fourth))
    assert found.fourth == pytest.approx(expected[np.ix_(place, place)], abs=1e-7)


def test_gradients_give_the_same_third_derivatives_as_hessians() -> None:
    """Rates in mixed-up log coordinates, of which every pair is looked at."""
    shapes, mixing = np.array([15.0, 40.0, 100.0]), STRETCH @ TURN
    hessians_at, hessian, *_ = log_gammas(shapes, mixing)
    back = np.linalg.inv(mixing)

    def gradients_at(offsets: Array) -> Array:
        return np.asarray((shapes - shapes * np.exp(offsets @ back.T)) @ back)

    whole, part = bending(hessians_at, hessian), partial_bending(gradients_at, hessian)
    size = np.abs(whole.third).max()
    assert part.axes == pytest.approx(whole.axes)
    assert part.third == pytest.approx(whole.third, abs=0.05 * size)
    assert part.third != pytest.approx(0.8 * whole.third, abs=0.05 * size)
    assert np.diag(part.fourth) == pytest.approx(np.diag(whole.fourth), abs=0.1 * np.abs(whole.fourth).max())
    assert part.ln_correction == 0.0
    assert part.doubt > 0.0


def test_whitened_axes_make_the_hessian_minus_one() -> None:
    _, hessian, *_ = log_gammas(np.array([3.0, 8.0, 40.0]), STRETCH @ TURN)
    axes = bending(lambda z: np.repeat(hessian[None], len(z), axis=0), hessian).axes
    back = np.linalg.inv(axes)
    assert back.T @ hessian @ back == pytest.approx(-np.eye(3), abs=1e-10)


def test_a_gaussian_has_no_bend_and_no_correction() -> None:
    hessian = -np.array([[2.0, 0.5], [0.5, 1.0]])
    found = bending(lambda z: np.repeat(hessian[None], len(z), axis=0), hessian)
    assert np.abs(found.third).max() < 1e-12
    assert found.ln_correction == pytest.approx(0.0, abs=1e-12)
    assert found.doubt == pytest.approx(0.0, abs=1e-12)


def test_the_correction_in_one_dimension_is_the_textbook_one() -> None:
    """K4/8 + 5 K3^2/24; a gamma of shape a in ln x has K3^2 = 1/a, K4 = -1/a: Stirling's 1/(12 a)."""
    one = Bending(np.eye(1), np.array([[[-1.0 / np.sqrt(30.0)]]]), np.array([[-1.0 / 30.0]]))
    assert one.ln_correction == pytest.approx(1.0 / 360.0, rel=1e-12)


@pytest.mark.parametrize("mixing", [np.eye(3), TURN, STRETCH @ TURN], ids=["plain", "turned", "stretched"])
@pytest.mark.parametrize("shapes", [(20.0, 30.0, 60.0), (5.0, 8.0, 12.0), (4.0, 5.0, 6.0)])
def test_the_correction_brings_laplace_to_the_integral_of_gamma_densities(
    shapes: tuple[float, float, float], mixing: Array
) -> None:
    """The exact integral is a product of gamma functions, whatever axes it is seen in."""
    hessians_at, hessian, laplace, exact = log_gammas(np.array(shapes), mixing)
    found = bending(hessians_at, hessian)
    left = abs(laplace + found.ln_correction - exact)
    assert left < 0.4 * abs(laplace - exact)
    assert left < found.doubt
    assert found.doubt < 2.5 * abs(laplace - exact)


@pytest.mark.parametrize("size", [1, 2, 5])
def test_the_map_and_its_inverse_agree(size: int) -> None:
    generator = np.random.default_rng(size)
    bent = following(cubic(generator, size, 0.4))
    normal = generator.standard_normal((500, size))
    back, _ = bent.inverse(bent.forward(normal))
    assert back == pytest.approx(normal, abs=1e-10)


@pytest.mark.parametrize("size", [1, 2, 5])
def test_the_map_knows_its_own_change_of_volume(size: int) -> None:
    """Against the determinant of numerical differences of the map."""
    generator = np.random.default_rng(size)
    bent = following(cubic(generator, size, 0.4))
    normal = generator.standard_normal((50, size))
    step = 1e-6
    columns = [
        (bent.forward(normal + step * axis) - bent.forward(normal - step * axis)) / (2.0 * step)
        for axis in np.eye(size)
    ]
    ln_volume = np.linalg.slogdet(np.stack(columns, axis=2))[1]
    smooth = np.abs(normal).min(axis=1) > 1e-4  # the two sides of a coordinate are stretched differently
    assert bent.inverse(bent.forward(normal))[1][smooth] == pytest.approx(ln_volume[smooth], abs=1e-6)


def test_no_bend_leaves_draws_alone() -> None:
    normal = np.random.default_rng(0).standard_normal((20, 4))
    bent = following(np.zeros((4, 4, 4)))
    assert (bent.forward(normal) == normal).all()
    assert (bent.inverse(normal)[1] == 0.0).all()


def ln_weights(third: Array, shapes: Array, normal: Array) -> Array:
    """Return ln of gamma densities in whitened ln coordinates over the density of bent draws."""
    bent = following(third)
    y = bent.forward(normal)
    _, ln_volume = bent.inverse(y)
    root = np.sqrt(shapes)
    target = (root * y - shapes * np.expm1(y / root)).sum(axis=1)
    return np.asarray(target + 0.5 * (normal**2).sum(axis=1) + ln_volume)


def test_draws_that_follow_the_bend_have_far_more_even_weights() -> None:
    """And they stay a density: with weights, the bent draws give the same integral as straight ones."""
    shapes = np.array([4.0, 6.0, 9.0])
    third = np.zeros((3, 3, 3))
    third[np.arange(3), np.arange(3), np.arange(3)] = -1.0 / np.sqrt(shapes)
    normal = np.random.default_rng(6).standard_normal((20_000, 3))
    bent, straight = (np.exp(ln_weights(k, shapes, normal)) for k in (third, np.zeros((3, 3, 3))))
    exact = float(
        (special.gammaln(shapes) - shapes * np.log(shapes) + shapes + 0.5 * np.log(shapes)).sum()
        - 1.5 * np.log(2.0 * np.pi)
    )
    for weights in (bent, straight):
        error = weights.std() / np.sqrt(weights.size)
        assert abs(weights.mean() - np.exp(exact)) < 4.0 * error
    assert straight.std() / bent.std() > 2.5
