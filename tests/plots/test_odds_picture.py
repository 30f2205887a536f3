"""The odds picture, read from its marks: everything there, nothing cut off, no words on words."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from itertools import combinations

import numpy as np
import pytest
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.text import Text

from tests.records import hand_built as hand
from workbench.ensembles.results import Adequacy
from workbench.evidence.results import Weighing
from workbench.plots.odds import draw_odds
from workbench.plots.palette import DARK, LIGHT, Palette
from workbench.plots.ruler import mark_text, ruler_range, ruler_step

LN_10 = float(np.log(10.0))


def drawn(
    weighing: Weighing,
    adequacies: Sequence[Adequacy] = (),
    size: tuple[float, float] = (9.0, 3.2),
    palette: Palette = LIGHT,
) -> Axes:
    """Return axes with the first comparison drawn."""
    figure = Figure(figsize=size)
    axes = figure.add_axes((0.03, 0.03, 0.94, 0.94))
    draw_odds(axes, weighing.comparisons[0], adequacies or hand.adequacies(), weighing.evidences, palette)
    return axes


def words(axes: Axes) -> list[str]:
    return [text.get_text() for text in axes.texts if text.get_text()]


def x_of(axes: Axes, name: str) -> list[float]:
    """Return where the lines of a kind begin."""
    return [float(np.asarray(line.get_xdata())[0]) for line in axes.lines if line.get_gid() == name]


def visible(axes: Axes) -> list[Text]:
    return [text for text in axes.texts if text.get_text().strip()]


def test_the_marks_stand_at_their_odds() -> None:
    axes = drawn(hand.weighing(7.715, 0.1))
    assert x_of(axes, "prior odds") == [pytest.approx(-1.0)]
    assert x_of(axes, "posterior odds") == [pytest.approx(7.715 / LN_10 - 1.0)]
    ends = sorted(x_of(axes, "whisker end"))
    assert ends == pytest.approx([(7.715 - 0.69) / LN_10 - 1.0, (7.715 + 0.68) / LN_10 - 1.0])


def test_the_numbers_are_written() -> None:
    text = "\n".join(words(drawn(hand.weighing(7.715, 0.1))))
    assert "× Bayes factor  2,242 ± 11" in text
    assert "posterior odds  224.2 ± 1.1 : 1" in text
    assert "prior odds  1 : 10" in text
    assert "112 : 1 to 442 : 1" in text


@pytest.mark.parametrize("size", [(9.0, 3.2), (5.0, 2.6), (13.0, 4.0)])
@pytest.mark.parametrize("ln_factor", [-30.0, -2.3, -0.02, 0.0, 0.7, 2.3, 7.7, 13.9, 40.0, 300.0, 2000.0])
@pytest.mark.parametrize("prior_odds", [1.0, 1e-9])
def test_nothing_is_cut_off_and_no_words_collide(
    size: tuple[float, float], ln_factor: float, prior_odds: float
) -> None:
    axes = drawn(hand.weighing(ln_factor, prior_odds), hand.adequacies(0.003), size)
    check_words(axes)


@pytest.mark.parametrize("size", [(9.0, 3.2), (5.0, 2.6)])
def test_long_names_are_shortened_and_stay_apart(size: tuple[float, float]) -> None:
    weighing = hand.weighing()
    long = "a resonance whose name goes on for quite some time"
    comparison = replace(weighing.comparisons[0], hypothesis=long, against=f"no {long}")
    check_words(drawn(replace(weighing, comparisons=(comparison,)), size=size))


def check_words(axes: Axes) -> None:
    """Fail where words leave the figure or lie on other words."""
    canvas = axes.get_figure()
    assert canvas is not None
    frame = canvas.bbox
    boxes = {text.get_text(): text.get_window_extent() for text in visible(axes)}
    for text, box in boxes.items():
        assert frame.x0 <= box.x0, text
        assert box.x1 <= frame.x1, text
        assert frame.y0 <= box.y0, text
        assert box.y1 <= frame.y1, text
    for (one, first), (other, second) in combinations(boxes.items(), 2):
        assert not first.overlaps(second), f"{one!r} lies on {other!r}"


def test_the_check_for_collisions_can_fail() -> None:
    axes = drawn(hand.weighing())
    axes.text(0.0, 0.18, "x" * 40)
    with pytest.raises(AssertionError, match="lies on"):
        check_words(axes)


def test_a_failing_hypothesis_is_said_loudly_and_first() -> None:
    axes = drawn(hand.weighing(), hand.adequacies(0.003))
    (loud,) = [text for text in axes.texts if text.get_gid() == "adequacy"]
    assert loud.get_text().startswith("BACKGROUND ONLY DOES NOT DESCRIBE THE DATA")
    assert loud.get_bbox_patch() is not None
    heights = [text.get_position()[1] for text in visible(axes) if text is not loud]
    assert loud.get_position()[1] > max(heights)


def test_when_neither_fits_the_picture_says_so() -> None:
    text = "\n".join(words(drawn(hand.weighing(), hand.adequacies(0.0005, 0.0005))))
    assert "NEITHER HYPOTHESIS DESCRIBES THE DATA" in text


@pytest.mark.parametrize("palette", [LIGHT, DARK])
def test_what_is_not_established_has_no_odds_in_its_picture(palette: Palette) -> None:
    axes = drawn(hand.unestablished(), palette=palette)
    text = "\n".join(words(axes))
    assert "not established: no odds are given" in text
    assert "k-hat is 0.83" in text
    assert "posterior" not in text
    assert "Bayes factor" not in text
    assert x_of(axes, "posterior odds") == []
    check_words(axes)


@pytest.mark.parametrize("size", [(9.0, 3.2), (5.0, 2.6)])
@pytest.mark.parametrize("repeats", [1, 3, 12])
def test_reasons_of_any_length_stay_in_their_lane(size: tuple[float, float], repeats: int) -> None:
    weighing = hand.unestablished()
    reason = "; ".join(["a few draws dominate the sampling pass (k-hat 1.06, allowed below 0.70)"] * repeats)
    evidences = tuple(replace(item, established=False, reason=reason) for item in weighing.evidences)
    check_words(drawn(replace(weighing, evidences=evidences), size=size))


def test_the_ruler_holds_even_odds_and_every_value() -> None:
    low, high = ruler_range([3.0, 868.0])
    assert low < -1.0
    assert high > 868.0


@pytest.mark.parametrize(
    ("width", "step"), [(3.0, 1), (9.0, 1), (10.0, 2), (25.0, 5), (90.0, 10), (900.0, 100)]
)
def test_the_ruler_has_at_most_nine_steps(width: float, step: int) -> None:
    assert ruler_step(0.0, width) == step


def test_marks_are_read_as_odds() -> None:
    assert [mark_text(decade) for decade in (0, 3, -1, 6, -12)] == [
        "1 : 1",
        "1,000 : 1",
        "1 : 10",
        "$10^{6}$ : 1",
        "1 : $10^{12}$",
    ]
