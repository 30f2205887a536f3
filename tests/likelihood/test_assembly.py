"""From declarations to expected events: every convention of the analysis file, worked by hand."""

from __future__ import annotations

import math
from dataclasses import replace
from itertools import pairwise

import numpy as np
import numpy.typing as npt
import pytest
from scipy import integrate
from scipy.interpolate import PchipInterpolator

from tests.analyses import background, everything, region_of, signal
from workbench.hypotheses.analysis import Analysis, Exposure, Hypothesis, Parameter
from workbench.hypotheses.priors import Fixed, Normal, Uniform
from workbench.hypotheses.processes import Contribution, Process
from workbench.hypotheses.quantities import Curve
from workbench.hypotheses.shapes import Falling, Flat, Gaussian, Template, Templates
from workbench.hypotheses.uncertainties import Effect, Uncertainty
from workbench.likelihood.model import Model, compile_model

Array = npt.NDArray[np.float64]

EDGES = [0.0, 1.0, 2.0, 4.0]
NOMINAL = [4.0, 2.0, 2.0]
UP = [5.0, 1.5, 3.0]
DOWN = [2.0, 3.0, 2.0]


def compiled(analysis: Analysis, hypothesis: str = "background only") -> Model:
    return compile_model(analysis, hypothesis)


def expected(model: Model, **values: float) -> Array:
    """Expected events at parameter values and sources' z, all others at 0."""
    point = np.array([[values.get(name.replace(" ", "_"), 0.0) for name in model.names]])
    return np.asarray(model.expected(model.natural_seeds(point))[0][0])


def with_effects(
    *effects: Effect, regions: tuple[str, ...] | None = None, shape: Flat | Template
) -> Analysis:
    table = region_of(EDGES, None, {"nominal": NOMINAL, "up": UP, "down": DOWN})
    events = 8.0 if isinstance(shape, Flat) else None
    return Analysis(
        "By hand", (table,), (), (background("b", shape, events),), (Uncertainty("s", effects, regions),)
    )


def test_a_one_number_effect_multiplies_by_its_power() -> None:
    model = compiled(with_effects(Effect("b", 0.10), shape=Flat()))
    for z in (-1.0, 0.0, 0.5, 2.0):
        np.testing.assert_allclose(expected(model, s=z), np.array([2.0, 2.0, 4.0]) * 1.10**z, rtol=1e-14)


def test_a_two_sided_effect_is_exact_at_one_standard_deviation() -> None:
    """0.10 and { up = 0.10, down = -0.10 } differ at z = -1: 1/1.10 against 0.90."""
    model = compiled(with_effects(Effect("b", 0.10, -0.20), shape=Flat()))
    for z, factor in ((-1.0, 0.80), (0.0, 1.0), (1.0, 1.10)):
        np.testing.assert_allclose(expected(model, s=z), np.array([2.0, 2.0, 4.0]) * factor, rtol=1e-14)


def test_a_two_sided_effect_between_follows_the_written_formula() -> None:
    model = compiled(with_effects(Effect("b", 0.10, -0.20), shape=Flat()))
    z, c, u, d = 1.7, 0.25, math.log(1.10), math.log(0.80)
    g = (math.sqrt(z * z + c * c) - c) / (math.sqrt(1 + c * c) - c)
    factor = math.exp((u - d) * z / 2 + (u + d) * g / 2)
    np.testing.assert_allclose(expected(model, s=z)[0], 2.0 * factor, rtol=1e-14)


def test_a_two_sided_effect_on_the_same_side_stays_positive_and_smooth() -> None:
    """N13: both variations up. No kink at 0: the slope there is the mean of both sides."""
    model = compiled(with_effects(Effect("b", 0.30, 0.10), shape=Flat()))
    u, d = math.log(1.30), math.log(1.10)
    point = np.zeros((1, 1))
    seeds = model.natural_seeds(point)
    np.testing.assert_allclose(
        model.responses(seeds)[0, 0], np.array([2.0, 2.0, 4.0]) * (u - d) / 2, rtol=1e-12
    )
    np.testing.assert_allclose(expected(model, s=-1.0)[0], 2.2, rtol=1e-14)
    np.testing.assert_allclose(expected(model, s=1.0)[0], 2.6, rtol=1e-14)


def test_effects_of_several_sources_multiply() -> None:
    analysis = replace(
        with_effects(Effect("b", 0.10), shape=Flat()),
        uncertainties=(Uncertainty("s", (Effect("b", 0.10),)), Uncertainty("t", (Effect("b", 0.20),))),
    )
    assert expected(compiled(analysis), s=2.0, t=1.0)[0] == pytest.approx(2.0 * 1.21 * 1.2)


def test_a_template_variation_is_each_column_at_one_standard_deviation() -> None:
    model = compiled(with_effects(Effect("b", "up", "down"), shape=Template("nominal")))
    for z, column in ((-1.0, DOWN), (0.0, NOMINAL), (1.0, UP)):
        np.testing.assert_allclose(expected(model, s=z), column, rtol=1e-13)


def test_a_variation_keeps_its_change_of_normalisation_where_the_yield_is_given() -> None:
    analysis = with_effects(Effect("b", "up", "down"), shape=Template("nominal"))
    analysis = replace(analysis, processes=(background("b", Template("nominal"), 80.0),))
    for z, column in ((-1.0, DOWN), (0.0, NOMINAL), (1.0, UP)):
        np.testing.assert_allclose(expected(compiled(analysis), s=z), 10.0 * np.array(column), rtol=1e-13)


def additive(nominal: float, up: float, down: float, z: float, floor: float) -> float:
    """The additive form as the contract writes it."""
    c = 0.25
    g = (math.sqrt(z * z + c * c) - c) / (math.sqrt(1 + c * c) - c)
    v = nominal + (up - down) * z / 2 + (up + down - 2 * nominal) * g / 2
    return (v + math.sqrt(v * v + 4 * floor * floor)) / 2


@pytest.mark.parametrize("z", [-3.0, -1.0, -0.3, 0.0, 0.4, 1.0, 2.5])
def test_bins_without_a_ratio_follow_the_additive_form(z: float) -> None:
    nominal, up, down = [0.0, 2.0, 0.0, 3.0], [1.0, 0.0, 0.0, 4.0], [0.0, 3.0, 0.0, 2.5]
    region = region_of([0.0, 1, 2, 3, 4], None, {"n": nominal, "u": up, "d": down})
    source = Uncertainty("s", (Effect("b", "u", "d"),))
    model = compiled(Analysis("Additive", (region,), (), (background("b", Template("n")),), (source,)))
    floor = 1e-6 * 5.0 / 4
    found = expected(model, s=z)
    for index in (0, 1):
        by_hand = additive(nominal[index], up[index], down[index], z, floor)
        assert found[index] == pytest.approx(by_hand, rel=1e-9)
        assert found[index] > 0.0
    assert found[2] == 0.0  # a bin with N = U = D = 0 stays 0
    u, d = math.log(4 / 3), math.log(2.5 / 3)
    g = (math.sqrt(z * z + 0.0625) - 0.25) / (math.sqrt(1.0625) - 0.25)
    assert found[3] == pytest.approx(3 * math.exp((u - d) * z / 2 + (u + d) * g / 2), rel=1e-13)


def test_several_sources_add_up_in_an_additive_bin() -> None:
    region = region_of([0.0, 1, 2], None, {"n": [0.0, 2.0], "u": [1.0, 2.0], "w": [0.5, 2.0]})
    sources = (
        Uncertainty("s", (Effect("b", "u", "n"),)),
        Uncertainty("t", (Effect("b", "w", "n"),)),
        Uncertainty("size", (Effect("b", 0.5),)),
    )
    model = compiled(Analysis("Additive", (region,), (), (background("b", Template("n")),), sources))
    # At z = 1 both are exact, and the one on the whole process multiplies.
    assert expected(model, s=1.0, t=1.0, size=1.0)[0] == pytest.approx(1.5 * 1.5, rel=1e-6)


def two_regions(source: Uncertainty, observed: list[float] | None = None) -> Analysis:
    regions = (region_of([0.0, 1.0], observed, name="here"), region_of([0.0, 1.0], observed, name="there"))
    both = Process(
        "b", "background", {"here": Contribution(Flat(), 10.0), "there": Contribution(Flat(), 20.0)}
    )
    return Analysis("Two", regions, (), (both,), (source,))


def test_a_source_is_limited_to_its_regions() -> None:
    source = Uncertainty("s", (Effect("b", 0.10),), regions=("there",))
    assert expected(compiled(two_regions(source)), s=1.0) == pytest.approx([10.0, 22.0])


def test_an_effect_has_a_size_in_each_region() -> None:
    source = Uncertainty(
        "s", (Effect("b", 0.05, regions=("here",)), Effect("b", 0.02, -0.03, regions=("there",)))
    )
    model = compiled(two_regions(source))
    assert expected(model, s=1.0) == pytest.approx([10.5, 20.4])
    assert expected(model, s=-1.0) == pytest.approx([10 / 1.05, 19.4])


def test_the_exposure_moves_what_follows_it() -> None:
    fixed = replace(background("fixed", Flat(), 7.0), follows_exposure=False)
    analysis = Analysis(
        "Exposure",
        (region_of([0.0, 1.0]),),
        (),
        (background("b", Flat(), 10.0), fixed),
        (),
        (),
        Exposure(3.0, "d", 0.02),
    )
    model = compiled(analysis)
    assert model.names == ("exposure",)
    assert expected(model, exposure=2.0)[0] == pytest.approx(10.0 * 1.02**2 + 7.0)


def test_factors_yields_and_curves_multiply() -> None:
    curve = Curve("mass", (10.0, 20.0, 40.0), (1.0, 3.0, 4.0))
    analysis = Analysis(
        "Products",
        (region_of([0.0, 1.0]),),
        (
            Parameter("rate", Uniform(0.0, 9.0)),
            Parameter("mass", Uniform(10.0, 40.0)),
            Parameter("k", Fixed(2.0)),
        ),
        (background("b", Flat(), (5.0, "k", curve), "rate", 0.5),),
    )
    found = expected(compiled(analysis), rate=3.0, mass=27.0)[0]
    at_mass = float(PchipInterpolator([10.0, 20.0, 40.0], [1.0, 3.0, 4.0])(27.0))
    assert found == pytest.approx(5.0 * 2.0 * at_mass * 3.0 * 0.5, rel=1e-12)


def test_shapes_are_integrals_over_the_bins() -> None:
    """scipy.integrate.quad over each bin."""
    analysis = Analysis(
        "Shapes",
        (region_of(EDGES),),
        (Parameter("scale", Normal(3.0, 0.1)),),
        (background("b", Falling("scale"), 50.0), background("p", Gaussian(1.4, 0.6), 10.0)),
    )
    found = expected(compiled(analysis), scale=2.5)
    norm = 2.5 * (1 - math.exp(-4.0 / 2.5))
    for index, (low, high) in enumerate(pairwise(EDGES)):
        falling = integrate.quad(lambda x: 50.0 * math.exp(-x / 2.5) / norm, low, high)[0]
        peak = integrate.quad(
            lambda x: 10.0 * math.exp(-((x - 1.4) ** 2) / 0.72) / math.sqrt(0.72 * math.pi), low, high
        )[0]
        assert found[index] == pytest.approx(falling + peak, rel=1e-9)


def test_templates_interpolate_bin_by_bin() -> None:
    columns = {"light": [3.0, 1.0], "middle": [2.0, 2.0], "heavy": [1.0, 4.0]}
    shape = Templates("mass", (1.0, 2.0, 4.0), ("light", "middle", "heavy"))
    region = region_of([0.0, 1.0, 2.0], None, columns)
    parameter = (Parameter("mass", Uniform(1.0, 4.0)),)
    own = Analysis("Own sums", (region,), parameter, (background("b", shape),))
    given = Analysis("A yield", (region,), parameter, (background("b", shape, 12.0),))
    values = np.array(list(columns.values()))
    np.testing.assert_allclose(
        expected(compiled(own), mass=2.9), PchipInterpolator([1.0, 2.0, 4.0], values)(2.9), rtol=1e-12
    )
    normalised = values / values.sum(axis=1, keepdims=True)
    np.testing.assert_allclose(
        expected(compiled(given), mass=2.9),
        12.0 * PchipInterpolator([1.0, 2.0, 4.0], normalised)(2.9),
        rtol=1e-12,
    )


def test_a_hypothesis_holds_what_it_fixes_and_knows_which_parameters_are_the_signals() -> None:
    analysis = Analysis(
        "Held",
        (region_of(EDGES, [1.0, 2.0, 3.0]),),
        (
            Parameter("strength", Uniform(0, 5)),
            Parameter("mass", Uniform(0, 4)),
            Parameter("scale", Normal(3, 0.1)),
        ),
        (
            background("b", Falling("scale"), 20.0),
            signal("s", Gaussian("mass", 0.5), 5.0, "strength"),
        ),
        (),
        (Hypothesis("free", ("b", "s")), Hypothesis("held", ("b", "s"), fix={"mass": 2.0})),
    )
    free, held = compiled(analysis, "free"), compiled(analysis, "held")
    assert free.names == ("strength", "mass", "scale")
    assert held.names == ("strength", "scale")
    assert [c.role for c in free.coordinates] == ["signal", "signal", "nuisance"]
    assert [c.is_strength for c in free.coordinates] == [True, False, False]
    assert free.signal.tolist() == [1, 0]  # shapes first, then strengths
    both = expected(held, strength=2.0, scale=3.0), expected(free, strength=2.0, scale=3.0, mass=2.0)
    np.testing.assert_array_equal(*both)


def test_regions_stand_one_after_another_in_declaration_order() -> None:
    model = compile_model(everything(), "signal plus background")
    assert model.bins == 11
    assert {(part.process, part.bins.start, part.bins.stop) for part in model.parts} >= {
        ("falling", 0, 8),
        ("falling", 8, 11),
        ("polynomial", 8, 11),
    }
    assert model.observed is not None
    assert model.observed[[0, 8]].tolist() == [31.0, 25.0]
