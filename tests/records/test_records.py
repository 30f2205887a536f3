"""The keys of each record and what stands under them."""

from __future__ import annotations

import math
from dataclasses import replace
from importlib import metadata

import numpy as np
import pytest
import scipy

import workbench
from tests.records import hand_built as hand
from workbench.counts.binning import Binning
from workbench.counts.region import Region
from workbench.counts.table import Table
from workbench.hypotheses.processes import Contribution
from workbench.hypotheses.shapes import Flat
from workbench.records.check_record import check_record
from workbench.records.fit_record import fit_record
from workbench.records.outcomes import spread_of_ln_bayes_factor
from workbench.records.provenance import inputs, versions
from workbench.records.weigh_record import weigh_record


def test_the_record_of_a_weighing_has_its_fixed_keys() -> None:
    record = weigh_record(hand.weighed())
    assert {
        "format",
        "command",
        "title",
        "inputs",
        "versions",
        "seed",
        "hypotheses",
        "comparisons",
        "warnings",
    } <= set(record)
    assert (record["format"], record["command"], record["seed"]) == (1, "weigh", 1)
    (first, second), (comparison,) = record["hypotheses"], record["comparisons"]
    assert {
        "name",
        "prior",
        "posterior",
        "posterior_error",
        "ln_evidence",
        "ln_evidence_error",
        "established",
        "estimators",
        "adequacy",
    } <= set(first)
    assert set(first["estimators"][0]) >= {"name", "ln_evidence", "error"}
    assert set(first["adequacy"]) >= {"p", "p_error"}
    assert {
        "hypothesis",
        "against",
        "ln_bayes_factor",
        "ln_bayes_factor_error",
        "prior_odds",
        "posterior_odds",
        "posterior_odds_error",
        "established",
    } <= set(comparison)
    assert first["prior"] + second["prior"] == pytest.approx(1.0)
    assert first["posterior"] + second["posterior"] == pytest.approx(1.0)
    assert comparison["posterior_odds"] == pytest.approx(0.1 * math.exp(7.715))
    assert record["warnings"] == [
        {
            "code": "template-errors",
            "text": "The table has error columns, which template_errors = false leaves out.",
        }
    ]


def test_what_is_not_established_has_null_odds_and_keeps_its_estimators() -> None:
    record = weigh_record(hand.weighed(hand.unestablished()))
    second, (comparison,) = record["hypotheses"][1], record["comparisons"]
    assert second["established"] is False
    assert second["reason"].startswith("k-hat is 0.83")
    assert (second["posterior"], second["posterior_error"]) == (None, None)
    assert [item["name"] for item in second["estimators"]] == ["quadrature", "sampling"]
    assert comparison["established"] is False
    assert [comparison[key] for key in ("posterior_odds", "posterior_odds_error", "ln_posterior_odds")] == [
        None
    ] * 3


def test_the_engine_that_made_a_number_is_on_record_with_why() -> None:
    record = weigh_record(hand.weighed(hand.annealed()))
    first, second = record["hypotheses"]
    assert (first["engine"], first["engine_reason"]) == ("standard", None)
    assert second["engine"] == "annealed"
    assert second["engine_reason"].startswith("quadrature and sampling differ")
    assert [item["name"] for item in second["estimators"]] == ["quadrature", "sampling", "annealing"]
    assert "dynesty" not in record["versions"]
    given = hand.annealed()
    nested = replace(given.evidences[1], engine="nested")
    record = weigh_record(hand.weighed(replace(given, evidences=(given.evidences[0], nested))))
    assert record["versions"]["dynesty"] == metadata.version("dynesty")


def test_odds_beyond_floats_are_kept_by_their_logarithm() -> None:
    (comparison,) = weigh_record(hand.weighed(hand.weighing(2000.0)))["comparisons"]
    assert comparison["ln_posterior_odds"] == pytest.approx(2000.0 + math.log(0.1))
    assert comparison["log10_bayes_factor"] == pytest.approx(868.589, abs=1e-3)


def test_versions_are_those_that_ran() -> None:
    found = versions()
    assert found["oddsbench"] == workbench.__version__
    assert found["numpy"] == np.__version__
    assert (found["scipy"], found["iminuit"]) == (scipy.__version__, metadata.version("iminuit"))
    assert set(found) == {"oddsbench", "numpy", "scipy", "iminuit", "python"}


def test_two_tables_of_one_name_are_told_apart_by_their_regions() -> None:
    analysis = hand.analysis()
    first = analysis.regions[0]
    other = Table(Binning(np.array([0.0]), np.array([1.0])), np.array([3.0]), source="tern.csv")
    process = analysis.process("continuum")
    changed = replace(process, regions={**process.regions, "side": Contribution(Flat(), 3.0)})
    analysis = replace(
        analysis,
        regions=(first, Region("side", other)),
        processes=(changed, *analysis.processes[1:]),
    )
    found = inputs(analysis, hand.ORIGIN)
    assert found["tables"] == {"tern.csv": first.table.digest, "tern.csv (region side)": other.digest}
    assert found["analysis"] == hand.ORIGIN.digest


def test_the_record_of_a_fit_has_the_whole_correlation_matrix() -> None:
    record = fit_record(hand.fitted())
    second = record["hypotheses"][1]
    assert second["ending"] == "converged"
    assert np.array(second["correlations"]) == pytest.approx(hand.fits()[1].correlations)
    assert second["parameters"][1]["error_low"] is None
    assert record["seed"] is None


def test_the_record_of_a_check_says_who_uses_each_column() -> None:
    record = check_record(hand.checked())
    (region,) = record["regions"]
    assert region["observed"] == 327
    assert (region["empty_bins"], region["single_count_bins"]) == (1, 1)
    assert {name: entry["used_by"] for name, entry in region["columns"].items()} == {
        "fakes": ["fakes"],
        "fakes hard": ["fake composition (up)"],
        "fakes soft": ["fake composition (down)"],
        "spare": [],
    }
    assert record["hypotheses"][0]["prior_predictive"]["total"]["median"] == 318.0


def test_the_spread_over_strength_priors_holds_the_declared_one() -> None:
    comparison = hand.weighing().comparisons[0]
    assert spread_of_ln_bayes_factor(comparison) == pytest.approx((7.025, 8.395))
    assert spread_of_ln_bayes_factor(replace(comparison, sensitivity=())) is None
    assert spread_of_ln_bayes_factor(replace(comparison, ln_bayes_factor=None)) is None
