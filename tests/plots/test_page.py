"""The page of a weighing: every comparison, every region, in both themes; drawing leaves no traces."""

from __future__ import annotations

import matplotlib as mpl
import pytest

from tests.records import hand_built as hand
from workbench.plots.page import KINDS, picture_bytes, weighing_page
from workbench.plots.palette import DARK, LIGHT, Palette


@pytest.mark.parametrize("palette", [LIGHT, DARK])
def test_the_page_has_every_comparison_and_region(palette: Palette) -> None:
    page = weighing_page(hand.weighed(), palette)
    assert len(page.subfigs) == 2
    assert len(page.axes) == 3


def test_drawing_changes_no_settings() -> None:
    before = dict(mpl.rcParams)
    picture_bytes(weighing_page(hand.weighed()), "png")
    assert dict(mpl.rcParams) == before


def test_every_kind_can_be_saved() -> None:
    page = weighing_page(hand.weighed())
    assert all(len(picture_bytes(page, kind)) > 10_000 for kind in KINDS)
