"""Published Poisson regressions, declared as analyses and maximised by the project's own likelihood.

A log-linear model says ln(expected) = offset + sum of coefficient times covariate. With z a coefficient,
exp(z x) is what a template variation with ln ratios +x and -x does to a bin, so each covariate is a source
and each observation a bin. A fit would hold sources to their normal priors; these tests maximise the
likelihood alone. Where covariates are 0 or 1 the same model is declared with multiplying parameters, one
region an observation, and goes through the whole fit.
"""

from __future__ import annotations

import functools
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import numpy.typing as npt
import pytest
import statsmodels
from statsmodels.datasets import cpunish, randhie
from statsmodels.genmod import families
from statsmodels.genmod.generalized_linear_model import GLM

from tests.published.printed import Printed, of_topic
from workbench.counts.binning import Binning
from workbench.counts.region import Region
from workbench.counts.table import Table
from workbench.hypotheses.analysis import Analysis, Hypothesis, Parameter
from workbench.hypotheses.priors import LogUniform
from workbench.hypotheses.processes import Contribution, Process
from workbench.hypotheses.shapes import Flat, Template
from workbench.hypotheses.uncertainties import Effect, Uncertainty
from workbench.likelihood.fit import fit
from workbench.likelihood.laws import ln_saturated
from workbench.likelihood.model import Model, compile_model
from workbench.likelihood.newton import maximise
from workbench.likelihood.results import Ending

Array = npt.NDArray[np.float64]


@dataclass(frozen=True)
class Observations:
    """Counts, what they are proportional to, and covariates by name (the constant left out)."""

    counts: Array
    exposure: Array
    covariates: dict[str, Array]


@functools.cache
def observations(data: str) -> Observations:
    return {"doctors": doctors, "ships": ships, "executions": executions, "visits": visits}[data]()


def doctors() -> Observations:
    """Deaths of smoking and other doctors in five age groups, with person-years (R. Doll and A.B. Hill)."""
    counts = np.array([32, 104, 206, 186, 102, 2, 12, 28, 28, 31.0])
    years = np.array([52407, 43248, 28612, 12663, 5317, 18790, 10673, 5710, 2585, 1462.0])
    groups = {f"age {group}": np.tile(np.arange(5) == group, 2).astype(float) for group in range(1, 5)}
    return Observations(counts, years, {"smokes": np.repeat([1.0, 0.0], 5), **groups})


def ships() -> Observations:
    """Wave damage of cargo ships by type, year built and period of operation, with months of service."""
    path = Path(statsmodels.__file__).parent / "discrete" / "tests" / "results" / "ships.csv"
    rows = np.genfromtxt(path, delimiter=",", names=True)
    rows = rows[~np.isnan(rows["service"])]
    types = {f"ship{letter}": (rows["ship"] == number) * 1.0 for number, letter in enumerate("BCDE", start=2)}
    built = {f"built{year}": (rows["yr_con"] == code) * 1.0 for code, year in ((2, 65), (3, 70), (4, 75))}
    period = {"op75": (rows["yr_op"] == 2) * 1.0}
    return Observations(rows["accident"], rows["service"], {**types, **built, **period})


def executions() -> Observations:
    loaded = cpunish.load()
    covariates = {name: loaded.exog[name].to_numpy(dtype=float) for name in loaded.exog}
    covariates["VC100k96"] = np.log(covariates["VC100k96"])
    return Observations(loaded.endog.to_numpy(dtype=float), np.ones(17), covariates)


def visits() -> Observations:
    loaded = randhie.load()
    covariates = {name: loaded.exog[name].to_numpy(dtype=float) for name in loaded.exog}
    counts = loaded.endog.to_numpy(dtype=float)
    return Observations(counts, np.ones(counts.size), covariates)


def with_sources(data: Observations) -> tuple[Model, Array]:
    """Declare covariates as template variations; returns the model and the scale of each (constant first)."""
    bins = np.arange(data.counts.size + 1.0)
    scales = {name: float(np.max(np.abs(x))) for name, x in data.covariates.items()}
    columns = {"exposure": data.exposure}
    for name, x in data.covariates.items():
        columns[f"{name} up"] = data.exposure * np.exp(x / scales[name])
        columns[f"{name} down"] = data.exposure * np.exp(-x / scales[name])
    analysis = Analysis(
        title="Poisson regression",
        regions=(Region("observations", Table(Binning(bins[:-1], bins[1:]), data.counts, columns)),),
        processes=(Process("rate", "background", {"observations": Contribution(Template("exposure"))}),),
        uncertainties=(
            Uncertainty("constant", (Effect("rate", np.e - 1.0),)),
            *(Uncertainty(name, (Effect("rate", f"{name} up", f"{name} down"),)) for name in data.covariates),
        ),
        hypotheses=(Hypothesis("log-linear", ("rate",)),),
    )
    return compile_model(analysis, "log-linear"), np.array([1.0, *scales.values()])


@dataclass(frozen=True)
class LikelihoodAlone:
    """What a maximum-likelihood regression maximises: no prior and no penalty."""

    model: Model

    @property
    def low(self) -> Array:
        return np.full(self.model.size, -np.inf)

    @property
    def high(self) -> Array:
        return np.full(self.model.size, np.inf)

    def value(self, points: Array, counts: Array) -> Array:
        return self.model.ln_likelihood(self.model.natural_seeds(points), counts)

    def derivatives(self, points: Array, counts: Array) -> tuple[Array, Array, Array]:
        return self.model.derivatives(self.model.natural_seeds(points), counts)


@dataclass(frozen=True)
class Regression:
    coefficients: dict[str, float]
    ln_likelihood: float


def maximised(data: Observations) -> Regression:
    model, scales = with_sources(data)
    start = np.zeros((1, model.size))
    start[0, 0] = np.log(data.counts.sum() / data.exposure.sum())
    found = maximise(LikelihoodAlone(model), start, data.counts, tolerance=1e-20)
    values = found.points[0] / scales
    return Regression(dict(zip(model.names, map(float, values), strict=True)), float(found.values[0]))


@functools.cache
def full(data: str) -> Regression:
    return maximised(observations(data))


@functools.cache
def constant_only(data: str) -> Regression:
    known = observations(data)
    return maximised(Observations(known.counts, known.exposure, {}))


def answer(data: str, what: str, parameter: str = "") -> float:
    known, regression = observations(data), full(data)
    number = len(known.covariates) + 1
    if what in {"coefficient", "exp"}:
        value = regression.coefficients["constant" if parameter == "const" else parameter]
        return float(np.exp(value)) if what == "exp" else value
    top = regression.ln_likelihood
    if what == "aic":
        return 2.0 * number - 2.0 * top
    if what == "bic":
        return float(number * np.log(known.counts.size)) - 2.0 * top
    if what == "dof":
        return float(known.counts.size - number)
    if what == "loglik":
        return top
    bottom = constant_only(data).ln_likelihood
    return {
        "loglik0": bottom,
        "lr": 2.0 * (top - bottom),
        "deviance0": 2.0 * (float(ln_saturated(known.counts)) - bottom),
    }[what]


@of_topic("count-regression")
def test_a_published_regression(printed: Printed) -> None:
    printed.check(answer(**printed.inputs))


def as_regions(data: Observations) -> Analysis:
    """Declare covariates that are 0 or 1 as multiplying parameters, one region an observation."""
    names = ["constant", *data.covariates]

    def contribution(row: int) -> Contribution:
        used = [name for name in data.covariates if data.covariates[name][row]]
        return Contribution(Flat(), (float(data.exposure[row]), "constant", *used))

    rows = range(data.counts.size)
    one_bin = Binning(np.array([0.0]), np.array([1.0]))
    return Analysis(
        title="Poisson regression",
        regions=tuple(Region(f"row {row}", Table(one_bin, data.counts[row : row + 1])) for row in rows),
        parameters=tuple(Parameter(name, LogUniform(1e-7, 1e3)) for name in names),
        processes=(Process("rate", "background", {f"row {row}": contribution(row) for row in rows}),),
        hypotheses=(Hypothesis("log-linear", ("rate",)),),
    )


@pytest.mark.parametrize("data", ["doctors", "ships"])
def test_the_whole_fit_finds_the_published_regression_with_its_errors(data: str) -> None:
    """Coefficients against the maximum above; errors against those of statsmodels' regression."""
    known, maximum = observations(data), full(data)
    found = fit(as_regions(known), "log-linear", asymmetric=False)
    assert found.ending is Ending.CONVERGED
    assert found.ln_likelihood == pytest.approx(maximum.ln_likelihood, abs=1e-7)
    design = np.column_stack([np.ones(known.counts.size), *known.covariates.values()])
    reference = GLM(known.counts, design, family=families.Poisson(), offset=np.log(known.exposure)).fit()
    for one, error in zip(found.fitted, reference.bse, strict=True):
        assert np.log(one.value) == pytest.approx(maximum.coefficients[one.name], abs=1e-6)
        assert one.error is not None
        assert one.error / one.value == pytest.approx(error, rel=1e-5)
