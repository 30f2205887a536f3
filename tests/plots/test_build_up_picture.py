"""The picture of a build-up, read from its marks: curves, gaps, what fails, nothing cut off."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
import pytest
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure

from workbench.ensembles.build_up import BuildUp, Step
from workbench.ensembles.results import Adequacy
from workbench.ensembles.strengths import StrengthEstimate
from workbench.evidence.results import Comparison
from workbench.plots.build_up import BUILD_UP, build_up_page, build_up_words
from workbench.plots.drawing import Drawing, Look
from workbench.plots.palette import DARK, LIGHT, Palette

FIRST = "background only"
LONG = "a resonance of a kind that nobody has ever thought of, with a very long name"


def comparison(value: float | None, name: str = "resonance", *, established: bool = True) -> Comparison:
    stands = established and value is not None
    odds = 0.1 * float(np.exp(value)) if stands and value is not None else None
    return Comparison(name, FIRST, value, 0.02, 0.1, odds, None if odds is None else 0.02 * odds, stands)


def steps(values: Sequence[float | None], name: str = "resonance") -> BuildUp:
    """Return a build-up with an ln B every 4 fb^-1; none was computed from counts."""
    made = []
    for place, value in enumerate(values, start=1):
        fine = tuple(Adequacy(one, 9.0, 0.3, 0.03, 200, 0) for one in (FIRST, name))
        estimate = StrengthEstimate(1.25, 0.75, 1.75, 0.01, 0.01, 0.01, name, "strength")
        made.append(Step(4.0 * place, 100.0 * place, (), (), (comparison(value, name),), (estimate,), fine))
    return BuildUp(tuple(made), "fb^-1", 1)


RISING = steps([-0.5, 0.3, 1.8, 2.7, 4.1])


def drawn(found: BuildUp, palette: Palette = LIGHT) -> Axes:
    page = build_up_page(found, palette)
    FigureCanvasAgg(page).draw()  # type: ignore[no-untyped-call]
    (axes,) = page.axes
    return axes


def marks(axes: Axes, gid: str) -> list[tuple[float, float]]:
    lines = [line for line in axes.lines if line.get_gid() == gid]
    points = [np.stack([np.asarray(part, dtype=float) for part in line.get_data()], axis=1) for line in lines]
    return [(float(x), float(y)) for each in points for x, y in each]


def words(axes: Axes, gid: str) -> list[str]:
    return [text.get_text() for text in axes.texts if text.get_gid() == gid]


def changed(found: BuildUp, place: int, step: Step) -> BuildUp:
    return replace(found, steps=(*found.steps[:place], step, *found.steps[place + 1 :]))


def test_the_curve_runs_through_every_step() -> None:
    axes = drawn(RISING)
    expected = [(4.0, -0.5), (8.0, 0.3), (12.0, 1.8), (16.0, 2.7), (20.0, 4.1)]
    assert marks(axes, "curve") == expected
    assert marks(axes, "last") == [expected[-1]]
    low, high = axes.get_ylim()
    assert low < -0.5
    assert high > 4.1
    assert axes.get_xlabel() == "exposure [fb$^{-1}$]"


def test_the_band_is_one_error_on_either_side() -> None:
    (band,) = [one for one in drawn(RISING).collections if one.get_gid() == "error"]
    edges = np.asarray(band.get_paths()[0].vertices)
    at = edges[edges[:, 0] == 12.0][:, 1]
    assert at.min() == pytest.approx(1.78)
    assert at.max() == pytest.approx(1.82)


def test_what_the_last_step_says_is_written_with_prior_and_posterior_odds() -> None:
    (text,) = words(drawn(RISING), "end words")
    assert "ln B = 4.100 ± 0.020" in text
    assert "prior odds 1 : 10" in text
    assert "posterior odds 6.03 ± 0.12 : 1" in text


def test_a_step_that_is_not_established_is_an_open_mark_in_a_gap() -> None:
    doubtful = replace(RISING.steps[2], comparisons=(comparison(1.8, established=False),))
    axes = drawn(changed(RISING, 2, doubtful))
    assert marks(axes, "not established") == [(12.0, 1.8)]
    assert words(axes, "not established words") == ["not established"]
    assert np.isnan(marks(axes, "curve")[2][1])
    assert "Not established at 12 fb^-1." in build_up_words(changed(RISING, 2, doubtful))
    last = replace(RISING.steps[4], comparisons=(comparison(4.1, established=False),))
    assert words(drawn(changed(RISING, 4, last)), "end words")[0].endswith("not established")


def test_no_number_at_all_leaves_a_gap() -> None:
    axes = drawn(steps([0.2, None, 0.9]))
    assert np.isnan(marks(axes, "curve")[1][1])
    assert words(axes, "not established words") == []


def test_steps_that_no_hypothesis_describes_are_marked_and_said() -> None:
    assert marks(drawn(RISING), "no hypothesis fits") == []
    bad = tuple(replace(one, p=0.004) for one in RISING.steps[3].adequacies)
    failing = changed(RISING, 3, replace(RISING.steps[3], adequacies=bad))
    axes = drawn(failing)
    assert [x for x, _ in marks(axes, "no hypothesis fits")] == [16.0]
    assert words(axes, "failure words") == ["no hypothesis describes these counts (p < 0.01)"]
    assert "At 16 fb^-1 no hypothesis describes" in build_up_words(failing)
    one_only = replace(RISING.steps[3], adequacies=(bad[0], RISING.steps[3].adequacies[1]))
    assert marks(drawn(changed(RISING, 3, one_only)), "no hypothesis fits") == []


def test_the_words_hold_the_numbers_of_the_first_and_the_last_step() -> None:
    text = build_up_words(RISING)
    assert text.startswith("Build-up of the evidence in 5 steps. 4 fb^-1, 100 events: resonance: ln B = −0.5")
    assert "20 fb^-1, 500 events: resonance: ln B = 4.100 ± 0.020" in text
    assert "strength 1.25 (68 %: 0.75 to 1.75) if resonance holds" in text
    assert "in 1 step." in build_up_words(steps([1.0]))


def test_nothing_counted_is_said() -> None:
    assert words(drawn(BuildUp((), "", 1)), "none") == ["no counts so far"]
    assert "no counts so far" in build_up_words(BuildUp((), "", 1))


@pytest.mark.parametrize("palette", [LIGHT, DARK])
@pytest.mark.parametrize(
    "found", [RISING, steps([2.0], LONG), steps([-900.0, -2500.0], LONG), steps([1e-3] * 300)]
)
def test_no_word_is_cut_off(found: BuildUp, palette: Palette) -> None:
    axes = drawn(found, palette)
    figure = axes.get_figure(root=True)
    assert isinstance(figure, Figure)
    for text in axes.texts:
        box = text.get_window_extent()
        assert box.x0 >= 0.0
        assert box.x1 <= figure.bbox.x1
        assert box.y1 <= figure.bbox.y1


def test_a_page_takes_the_picture_with_a_row_of_numbers_for_each_step() -> None:
    picture = Drawing(BUILD_UP).picture(RISING, Look(is_dark=True))
    assert picture.png.startswith(b"\x89PNG")
    assert picture.alt == build_up_words(RISING)
    assert picture.readout is not None
    assert picture.readout.edges == pytest.approx((0.0, 6.0, 10.0, 14.0, 18.0, 20.4))
    assert picture.readout.rows[2].startswith("12 fb^-1, 300 events: resonance: ln B = 1.800")
