"""Statistical errors of templates, and bins that nothing can fill, worked by hand."""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt
import pytest

from tests.analyses import background, region_of
from workbench.counts.region import Region
from workbench.hypotheses.analysis import Analysis, Exposure, Parameter
from workbench.hypotheses.priors import Uniform
from workbench.hypotheses.shapes import Flat, Template
from workbench.hypotheses.uncertainties import Effect, Uncertainty
from workbench.likelihood.model import Model, compile_model, never_filled

Array = npt.NDArray[np.float64]

EDGES = [0.0, 1.0, 2.0, 4.0]
NOMINAL = [4.0, 2.0, 2.0]
UP = [5.0, 1.5, 3.0]
DOWN = [2.0, 3.0, 2.0]


def compiled(analysis: Analysis, hypothesis: str = "background only") -> Model:
    return compile_model(analysis, hypothesis)


def noisy(region: Region | None = None, **changes: float) -> Model:
    """A template with errors beside a formula, at other yields and exposures."""
    region = region or region_of(EDGES, None, {"t": NOMINAL}, {"t": [1.0, 0.5, 0.0]})
    events = changes.get("events")
    analysis = Analysis(
        "Template errors",
        (region,),
        (Parameter("k", Uniform(0.0, 9.0)),),
        (background("t", Template("t"), events, "k"), background("formula", Flat(), 4.0)),
        (Uncertainty("s", (Effect("t", 0.10),)),),
        (),
        Exposure(3.0, "d", 0.02),
    )
    return compiled(analysis)


def moments(model: Model, *point: float) -> tuple[Array, Array]:
    total, variance = model.expected(model.natural_seeds(np.array([point])))
    assert variance is not None
    return total[0], variance[0]


def test_template_errors_move_with_their_column() -> None:
    """V = (column error x what multiplies the column)^2; T includes what has no error column."""
    total, variance = moments(noisy(), 2.0, 1.0, 1.0)
    factor = 2.0 * 1.10 * 1.02
    np.testing.assert_allclose(total, factor * np.array(NOMINAL) + np.array([1, 1, 2.0]) * 1.02, rtol=1e-13)
    np.testing.assert_allclose(variance, (factor * np.array([1.0, 0.5, 0.0])) ** 2, rtol=1e-13)


@pytest.mark.parametrize("events", [8.0, 80.0])
def test_relative_template_errors_change_neither_with_yield_nor_with_exposure(events: float) -> None:
    for point in ((1.0, 0.0, 0.0), (3.0, 2.0, -1.5)):
        total, variance = moments(noisy(events=events), *point)
        of_template = total - np.array([1, 1, 2.0]) * 1.02 ** point[2]
        relative = np.sqrt(variance[:2]) / of_template[:2]
        np.testing.assert_allclose(relative, [1.0 / 4.0, 0.5 / 2.0], rtol=1e-12)


def test_a_template_variation_moves_the_errors_by_the_same_ratio() -> None:
    region = region_of(EDGES, None, {"t": NOMINAL, "u": UP}, {"t": [1.0, 0.5, 0.1]})
    source = Uncertainty("s", (Effect("t", "u", "t"),))
    model = compiled(Analysis("Ratio", (region,), (), (background("t", Template("t")),), (source,)))
    _, variance = moments(model, 1.0)
    ratio = np.array(UP) / np.array(NOMINAL)
    np.testing.assert_allclose(np.sqrt(variance), ratio * np.array([1.0, 0.5, 0.1]), rtol=1e-12)


def test_bins_that_nothing_can_fill_get_what_the_region_gives_them() -> None:
    region = region_of([0.0, 1, 2], [3.0, 1.0], {"t": [2.0, 0.0]}, empty_bin_events=0.3)
    model = compiled(Analysis("Empty", (region,), (), (background("t", Template("t")),)))
    total, variance = moments(model)
    assert total.tolist() == [2.0, 0.3]
    assert variance == pytest.approx([0.0, 0.09])
    # A = T^2/V = 1 there: P(1) = A/(A + T) x T/(A + T) = (1/1.3) (0.3/1.3).
    value = model.ln_likelihood(model.natural_seeds(np.zeros((1, 0))), np.array([3.0, 1.0]))[0]
    assert value == pytest.approx(math.log(8 / 6) - 2.0 + math.log(0.3 / 1.3**2), rel=1e-12)


def test_empty_bins_are_named_and_counts_there_are_impossible() -> None:
    region = region_of([0.0, 1, 2], [3.0, 1.0], {"t": [2.0, 0.0]})
    model = compiled(Analysis("Empty", (region,), (), (background("t", Template("t")),)))
    assert never_filled(model).tolist() == [False, True]
    assert model.ln_likelihood(model.natural_seeds(np.zeros((1, 0))), np.array([3.0, 1.0]))[0] == -np.inf
