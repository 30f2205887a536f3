"""The picture of pulls, read from its marks."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from tests.records import hand_built as hand
from workbench.likelihood.results import Fit
from workbench.plots.fitted import draw_fitted, inches_for, pulled


def drawn(fit: Fit) -> Axes:
    axes = Figure(figsize=(7.0, inches_for(fit))).add_axes((0.3, 0.2, 0.66, 0.66))
    draw_fitted(axes, fit)
    return axes


def test_each_pull_stands_over_the_band_of_its_prior() -> None:
    fit = hand.fits()[1]
    axes = drawn(fit)
    rows = pulled(fit)
    bands = [patch for patch in axes.patches if patch.get_gid() == "prior"]
    assert len(bands) == len(rows) == 5
    assert {(patch.get_x(), patch.get_width()) for patch in bands} == {(-1.0, 2.0)}  # type: ignore[attr-defined]
    points = [float(np.asarray(line.get_xdata())[0]) for line in axes.lines if line.get_gid() == "pull"]
    assert points == pytest.approx([item.pull for item in rows])


def test_the_bar_is_as_long_as_the_contraction_says() -> None:
    """By hand: contraction 0.64 leaves sqrt(0.36) = 0.6 of the prior's sd on each side."""
    fit = hand.fits()[0]
    fit = replace(fit, fitted=(replace(fit.fitted[0], pull=0.5, contraction=0.64),))
    (bar,) = [line for line in drawn(fit).lines if line.get_gid() == "posterior"]
    assert np.asarray(bar.get_xdata()) == pytest.approx([-0.1, 1.1])


def test_a_far_pull_stands_at_the_edge_with_its_number() -> None:
    fit = hand.fits()[0]
    fit = replace(fit, fitted=(replace(fit.fitted[0], pull=-12.34, contraction=0.5),))
    axes = drawn(fit)
    assert [text.get_text().strip() for text in axes.texts] == ["−12.3"]
    assert axes.get_xlim()[0] > -6.0


def test_a_pull_without_an_error_is_hollow() -> None:
    fit = hand.fits()[0]
    fit = replace(fit, fitted=(replace(fit.fitted[0], error=None, contraction=None),))
    axes = drawn(fit)
    (point,) = [line for line in axes.lines if line.get_gid() == "pull"]
    assert point.get_markerfacecolor() == "#ffffff"
    assert [line.get_gid() for line in axes.lines if line.get_gid() == "posterior"] == []


def test_a_fit_without_pulls_says_so() -> None:
    axes = drawn(replace(hand.fits()[0], fitted=()))
    assert [text.get_text() for text in axes.texts] == ["no parameter of this hypothesis has a pull"]
