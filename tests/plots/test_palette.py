"""The palette: told apart in grey and by colour-blind readers, readable on both themes."""

from __future__ import annotations

from itertools import combinations

import numpy as np
import pytest

from workbench.plots.palette import DARK, LIGHT, Palette

PALETTES = {"light": LIGHT, "dark": DARK}

# Projection of linear RGB for a reader without M cones.
# Source: F. Viénot, H. Brettel and J.D. Mollon, Color Res. Appl. 24 (1999) 243; from memory.
TO_LMS = np.array([[17.8824, 43.5161, 4.11935], [3.45565, 27.1554, 3.86714], [0.0299566, 0.184309, 1.46709]])
WITHOUT_M = np.array([[1.0, 0.0, 0.0], [0.494207, 0.0, 1.24827], [0.0, 0.0, 1.0]])
TO_XYZ = np.array([[0.4124, 0.3576, 0.1805], [0.2126, 0.7152, 0.0722], [0.0193, 0.1192, 0.9505]])
WHITE = TO_XYZ.sum(axis=1)


def linear(colour: str) -> np.ndarray[tuple[int], np.dtype[np.float64]]:
    """Return linear RGB of an sRGB colour (IEC 61966-2-1)."""
    part = np.array([int(colour[place : place + 2], 16) for place in (1, 3, 5)]) / 255.0
    return np.where(part <= 0.04045, part / 12.92, ((part + 0.055) / 1.055) ** 2.4)


def luminance(colour: str) -> float:
    """Return relative luminance (WCAG 2.1)."""
    return float(TO_XYZ[1] @ linear(colour))


def lightness(colour: str) -> float:
    """Return CIE L*."""
    return float(116.0 * np.cbrt(luminance(colour)) - 16.0)


def contrast(one: str, other: str) -> float:
    """Return the contrast ratio (WCAG 2.1)."""
    low, high = sorted((luminance(one), luminance(other)))
    return (high + 0.05) / (low + 0.05)


def lab(rgb: np.ndarray[tuple[int], np.dtype[np.float64]]) -> np.ndarray[tuple[int], np.dtype[np.float64]]:
    """Return CIE L*a*b* of linear RGB."""
    x, y, z = np.cbrt(np.maximum(TO_XYZ @ rgb, 1e-6) / WHITE)
    return np.array([116.0 * y - 16.0, 500.0 * (x - y), 200.0 * (y - z)])


def seen_without_m(colour: str) -> np.ndarray[tuple[int], np.dtype[np.float64]]:
    """Return L*a*b* as a deuteranope sees a colour."""
    rgb = np.linalg.inv(TO_LMS) @ WITHOUT_M @ TO_LMS @ linear(colour)
    return lab(np.clip(rgb, 0.0, 1.0))


@pytest.fixture(params=PALETTES)
def palette(request: pytest.FixtureRequest) -> Palette:
    return PALETTES[request.param]


def test_background_and_signal_are_told_apart_in_grey(palette: Palette) -> None:
    assert abs(lightness(palette.background.line) - lightness(palette.signal.line)) > 12.0
    assert abs(lightness(palette.background.fill) - lightness(palette.signal.fill)) > 2.5


def test_the_check_of_greys_can_fail() -> None:
    assert abs(lightness("#5b7fa6") - lightness("#c4572a")) < 3.0


def test_background_and_signal_are_told_apart_without_the_m_cones(palette: Palette) -> None:
    apart = seen_without_m(palette.background.line) - seen_without_m(palette.signal.line)
    assert np.linalg.norm(apart) > 40.0
    alike = seen_without_m("#a05028") - seen_without_m("#6a6a20")
    assert np.linalg.norm(alike) < 20.0


def test_words_are_read_and_marks_are_seen_on_their_paper(palette: Palette) -> None:
    words = [palette.ink, palette.muted, *(stroke.words for stroke in palette.hypotheses)]
    assert min(contrast(colour, palette.paper) for colour in words) >= 4.5
    marks = [palette.faint, *(stroke.line for stroke in palette.hypotheses)]
    assert min(contrast(colour, palette.paper) for colour in marks) >= 3.0


def test_no_two_hypotheses_share_colour_and_dashes(palette: Palette) -> None:
    strokes = [palette.hypothesis(place) for place in range(4)]
    assert all(one != other for one, other in combinations(strokes, 2))
    assert palette.hypothesis(4) == palette.hypothesis(1)


def test_no_fill_is_green_or_yellow(palette: Palette) -> None:
    for stroke in palette.hypotheses[:3]:
        red, green, blue = linear(stroke.fill)
        assert green <= max(red, blue)
