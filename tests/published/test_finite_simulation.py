"""Templates with statistical errors, against what others derived for finite simulations.

The project integrates one gamma-distributed factor a bin; the papers maximise over it, or over each
template's content. These are different questions, so beside each identity stands how far the answers agree.
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy import integrate, optimize, stats

from tests.published.printed import Printed, of_topic
from workbench.likelihood.laws import ln_negative_binomial


def per_bin_factor(n: int, mu: float, rel: float) -> float:
    """The positive root of beta^2 + (mu r^2 - 1) beta - n r^2 = 0."""
    half = 0.5 * (1.0 - mu * rel**2)
    return float(half + np.sqrt(half * half + n * rel**2))


def profile(beta: float, n: int, mu: float, rel: float) -> float:
    return float(n * np.log(beta * mu) - beta * mu - 0.5 * ((beta - 1.0) / rel) ** 2)


@of_topic("finite-mc", "per-bin")
def test_the_factor_of_a_bin_is_where_its_likelihood_is_largest(printed: Printed) -> None:
    n, mu, rel = (printed.inputs[name] for name in ("n", "mu", "rel"))
    found = optimize.minimize_scalar(
        lambda beta: -profile(beta, n, mu, rel),
        bounds=(1e-6, 5.0),
        method="bounded",
        options={"xatol": 1e-10},
    )
    printed.check(per_bin_factor(n, mu, rel) - float(found.x))


@pytest.mark.parametrize(("n", "mu", "rel", "agreement"), [(12, 8.0, 0.3, 0.06), (3, 5.0, 0.1, 0.002)])
def test_the_projects_law_integrates_what_that_factor_maximises(
    n: int, mu: float, rel: float, agreement: float
) -> None:
    """The same bin with a Gaussian factor, integrated: both laws agree as the factor's width shrinks."""
    gaussian, _ = integrate.quad(
        lambda beta: stats.poisson.pmf(n, beta * mu) * stats.norm.pdf(beta, 1.0, rel),
        0.0,
        1.0 + 10.0 * rel,
        points=[per_bin_factor(n, mu, rel)],
    )
    ours = float(ln_negative_binomial(np.asarray(n), np.asarray(mu), np.asarray((rel * mu) ** 2)))
    assert ours == pytest.approx(np.log(gaussian), abs=agreement)


@pytest.mark.parametrize(("n", "mu", "rel"), [(12, 8.0, 0.3), (3, 5.0, 0.1), (0, 2.0, 0.5), (40, 1e-3, 1.0)])
def test_the_projects_law_is_the_integral_over_its_factor(n: int, mu: float, rel: float) -> None:
    shape = 1.0 / rel**2
    posterior_mean = (n + shape) / (mu + shape)
    direct, _ = integrate.quad(
        lambda g: stats.poisson.pmf(n, g * mu) * stats.gamma.pdf(g, shape, scale=1.0 / shape),
        0.0,
        posterior_mean + 40.0 * (rel + 1.0),
        points=[posterior_mean],
        epsabs=0.0,
        epsrel=1e-11,
        limit=300,
    )
    ours = float(ln_negative_binomial(np.asarray(n), np.asarray(mu), np.asarray((rel * mu) ** 2)))
    assert ours == pytest.approx(np.log(direct), abs=1e-8)


def template_contents(d: int, a: tuple[int, int], p: tuple[float, float]) -> tuple[float, float]:
    """Solve d/(1 - t) = sum p_j A_j with A_j = a_j/(1 + p_j t)."""

    def gap(t: float) -> float:
        return d / (1.0 - t) - sum(p_j * a_j / (1.0 + p_j * t) for a_j, p_j in zip(a, p, strict=True))

    t = optimize.brentq(gap, -1.0 / max(p) + 1e-9, 1.0 - 1e-9, xtol=1e-14)
    return a[0] / (1.0 + p[0] * t), a[1] / (1.0 + p[1] * t)


@of_topic("finite-mc", "two-templates")
def test_the_contents_of_two_templates_are_where_their_likelihood_is_largest(printed: Printed) -> None:
    d, a = printed.inputs["d"], (printed.inputs["a1"], printed.inputs["a2"])
    p = (printed.inputs["p1"], printed.inputs["p2"])

    def loss(ln_contents: np.ndarray) -> float:
        contents = np.exp(ln_contents)
        mean = float(np.dot(p, contents))
        return float(mean - d * np.log(mean) + np.sum(contents - np.array(a) * ln_contents))

    found = np.exp(optimize.minimize(loss, np.log(a), tol=1e-12, method="Nelder-Mead").x)
    solved = template_contents(d, a, p)
    printed.check(float(np.max(np.abs(found - solved))))


def test_one_gamma_factor_moves_the_bins_total_as_the_two_templates_do() -> None:
    """The posterior mean of g T, (d + A)/(1 + A/T), beside the maximum over both templates: within 0.1 %."""
    d, a, p = 12, np.array([30.0, 18.0]), np.array([0.2, 0.3])
    total, variance = float(p @ a), float((p * p) @ a)
    shape = total**2 / variance
    ours = (d + shape) / (1.0 + shape / total)
    assert ours == pytest.approx(float(p @ np.array(template_contents(d, (30, 18), (0.2, 0.3)))), rel=1e-3)
