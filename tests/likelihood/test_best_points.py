"""The search for the best fit of many rows of counts finds the highest peak, not the nearest."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import numpy as np
import numpy.typing as npt
import pytest

from workbench.ensembles.drawing import draw_counts, draw_parameters
from workbench.hypotheses.file.reading import read_analysis
from workbench.likelihood import starts
from workbench.likelihood.fit import fit
from workbench.likelihood.model import Model, compile_model
from workbench.likelihood.starts import best_points, searcher

Array = npt.NDArray[np.float64]

ROOT = Path(__file__).parents[2]
SKERRY = ROOT / "data" / "skerry" / "skerry.toml"
ROWS = 400
SAME = 1e-3  # in T = -2 ln p


@pytest.fixture(scope="module")
def resonance() -> Model:
    return compile_model(read_analysis(SKERRY), "resonance")


@pytest.fixture(scope="module", params=["background only", "resonance"])
def drawn(request: pytest.FixtureRequest) -> Array:
    """Counts with no peak but chance's, or with one somewhere in the searched range."""
    truth = compile_model(read_analysis(SKERRY), request.param)
    generator = np.random.default_rng(20)
    return draw_counts(truth, draw_parameters(truth, generator, ROWS), generator)


def heights(model: Model, counts: Array) -> Array:
    """Return (row,) T up to a constant of each row."""
    return -2.0 * best_points(searcher(model), counts, tolerance=1e-4)[1]


def heights_of_a_wider_search(model: Model, counts: Array, monkeypatch: pytest.MonkeyPatch) -> Array:
    """Return the same with three times as many candidates and three times as many climbs."""
    with monkeypatch.context() as patch:
        patch.setattr(starts, "_GRID", 3 * starts._GRID)
        patch.setattr(starts, "_BEHIND", np.inf)
        return -2.0 * best_points(searcher(model), counts, climbs=3 * starts._CLIMBS)[1]


def test_a_search_three_times_as_wide_finds_the_same_peak_in_99_of_100(
    resonance: Model, drawn: Array, monkeypatch: pytest.MonkeyPatch
) -> None:
    found = heights(resonance, drawn)
    wider = heights_of_a_wider_search(resonance, drawn, monkeypatch)
    assert np.mean(np.abs(found - wider) < SAME) >= 0.99


def test_a_search_of_eight_places_misses_peaks(
    resonance: Model, drawn: Array, monkeypatch: pytest.MonkeyPatch
) -> None:
    """The negative control of the test above."""
    wider = heights_of_a_wider_search(resonance, drawn, monkeypatch)
    monkeypatch.setattr(starts, "_GRID", 8)
    assert np.mean(np.abs(heights(resonance, drawn) - wider) < SAME) < 0.9


def test_a_row_is_fitted_the_same_alone_and_among_others(resonance: Model, drawn: Array) -> None:
    search = searcher(resonance)
    together = best_points(search, drawn[:20])[1]
    alone = np.array([best_points(search, row[None])[1][0] for row in drawn[:20]])
    np.testing.assert_allclose(together, alone, atol=1e-5)


def test_every_row_gets_its_own_best_point(resonance: Model, drawn: Array) -> None:
    search = searcher(resonance)
    points, values, converged = best_points(search, drawn)
    assert converged.all()
    np.testing.assert_allclose(search.objective.value(points, drawn), values, atol=1e-9)


def test_a_fit_without_asymmetric_errors_loads_no_iminuit() -> None:
    """The command `weigh` loaded it on every start and ran it to find what was known already."""
    code = (
        "import sys\n"
        "from workbench.hypotheses.file.reading import read_analysis\n"
        "from workbench.likelihood.fit import fit\n"
        f"found = fit(read_analysis({str(SKERRY)!r}), 'resonance', asymmetric=False)\n"
        "print(found.ending.name, 'iminuit' in sys.modules)\n"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True, cwd=ROOT)
    assert done.stdout == "CONVERGED False\n"


def test_a_fit_with_and_without_asymmetric_errors_ends_at_the_same_point() -> None:
    analysis = read_analysis(SKERRY)
    whole, quick = fit(analysis, "resonance"), fit(analysis, "resonance", asymmetric=False)
    assert whole.ending is quick.ending
    for one, other in zip(whole.fitted, quick.fitted, strict=True):
        assert one.error is not None
        assert other.error == pytest.approx(one.error, rel=1e-4)
        assert other.value == pytest.approx(one.value, abs=1e-4 * one.error)
