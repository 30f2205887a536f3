"""Nested sampling: right within its error, which holds what runs differ by; and what is missing is said."""

from __future__ import annotations

import sys
from dataclasses import replace

import numpy as np
import pytest

from tests.evidence.small_analyses import TAU, YIELD, counting, several_bins, source, templates
from workbench.errors import InputError
from workbench.evidence.formulas import closed_forms
from workbench.evidence.nested import LEAST_RUNS, Run, combined_error, from_cube, sample_nested, scatter
from workbench.evidence.weigh import weigh
from workbench.hypotheses.priors import Exponential, Gamma
from workbench.likelihood.model import compile_model

SIGNAL = "signal plus background"


def runs(*values: float, error: float = 0.1) -> list[Run]:
    return [Run(value, error, 1000, np.zeros((0, 1)), np.zeros(0)) for value in values]


@pytest.mark.slow
def test_on_off_counts_have_their_closed_form_within_the_error() -> None:
    model = compile_model(counting(8, Gamma(1.5, 0.1), Exponential(1.0), control=14), SIGNAL)
    assert model.observed is not None
    found = sample_nested(model, model.observed, np.random.SeedSequence(1), live=100)
    exact = closed_forms.ln_on_off_signal(8, 14, TAU, (1.5, 0.1), (1.0, 1.0 / YIELD))
    assert not found.doubt
    assert len(found.runs) >= LEAST_RUNS
    assert found.error < 0.2
    assert abs(found.ln_evidence - exact) < 4.0 * found.error
    assert len(set(found.runs)) == len(found.runs)
    # Draws: their weights add up to Z, and their mean is the posterior's (by hand: more than its prior's 1).
    assert np.exp(found.ln_weights).mean() == pytest.approx(np.exp(found.runs).mean(), rel=1e-6)
    assert found.points.shape == (found.ln_weights.size, 2)
    again = sample_nested(model, model.observed, np.random.SeedSequence(1), live=100)
    assert again.ln_evidence == found.ln_evidence


def test_the_error_is_the_larger_of_what_runs_report_and_how_they_scatter() -> None:
    """By hand: 0.1/sqrt 3; and sd 1 of (-1, 0, 1), times t = 1.3213, over sqrt 3."""
    assert combined_error(runs(0.0, 0.001, 0.002)) == pytest.approx(0.1 / np.sqrt(3.0))
    assert combined_error(runs(-1.0, 0.0, 1.0)) == pytest.approx(1.3213 / np.sqrt(3.0), rel=1e-3)


def test_runs_that_differ_by_far_more_than_they_report_are_doubted() -> None:
    assert scatter(runs(0.0, 0.1, 0.2)) == ""
    assert "runs of nested sampling differ" in scatter(runs(0.0, 0.1, 0.9))
    assert "no draw" in scatter(runs(-np.inf, -np.inf, -np.inf))


def test_the_unit_cube_is_mapped_to_finite_coordinates() -> None:
    """Phi(-1.959964) = 0.025, from tables."""
    assert from_cube(np.array([0.025]))[0] == pytest.approx(-1.959964, abs=1e-6)
    assert np.isfinite(from_cube(np.array([0.0, 1.0]))).all()


def test_a_missing_dynesty_is_named_with_what_installs_it(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setitem(sys.modules, "dynesty", None)
    region = several_bins("r", [3.0], {"background": [2.0], "signal": [1.0]})
    analysis = templates(region, Exponential(1.0), (source("size", background=0.2),))
    with pytest.raises(InputError, match=r"pip install 'oddsbench\[nested\]'"):
        weigh(analysis, engine="nested")
    assert weigh(replace(analysis), engine="standard").established
