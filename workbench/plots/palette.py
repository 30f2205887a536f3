"""The house palette: one hue for background, one for signal, told apart in grey and by colour-blind readers.

Background is always the lighter of the two and signal the darker on paper (the reverse of lightness never
happens between themes: on the dark theme background stays the lighter), so a grey print keeps them apart.
"""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Stroke:
    """How one hypothesis is drawn.

    Attributes:
        line: colour of its marks.
        words: colour of words about it, dark enough to read.
        fill: colour of its bands.
        width: line width [points].
        dashes: matplotlib line style.
    """

    line: str
    words: str
    fill: str
    width: float
    dashes: str | tuple[int, tuple[int, ...]] = "-"


@dataclass(frozen=True, slots=True)
class Palette:
    """Colours of one theme.

    Attributes:
        paper: what is drawn on.
        ink: data and words.
        muted: secondary words.
        faint: axes, ticks, guides.
        hypotheses: how the hypotheses are drawn, in file order; the first is background only.
    """

    paper: str
    ink: str
    muted: str
    faint: str
    hypotheses: tuple[Stroke, ...]

    @property
    def background(self) -> Stroke:
        """Return how the first hypothesis is drawn."""
        return self.hypotheses[0]

    @property
    def signal(self) -> Stroke:
        """Return how the second hypothesis is drawn."""
        return self.hypotheses[1]

    def steps(self, number: int, place: int = 1) -> tuple[str, ...]:
        """Return steps of lightness of one hypothesis' hue, from nearly paper to its words' colour.

        Args:
            number: how many.
            place: the hypothesis' place in file order.
        """
        far, near = self.hypothesis(place).words, self.paper
        shares = [0.04 + 0.96 * step / max(number - 1, 1) for step in range(number)]
        return tuple(_mixed(near, far, share) for share in shares)

    def hypothesis(self, place: int) -> Stroke:
        """Return how a hypothesis is drawn; those beyond the palette start again at the second."""
        if place < len(self.hypotheses):
            return self.hypotheses[place]
        return self.hypotheses[1 + (place - 1) % (len(self.hypotheses) - 1)]


def _mixed(first: str, second: str, share: float) -> str:
    parts = [
        round((1.0 - share) * int(first[at : at + 2], 16) + share * int(second[at : at + 2], 16))
        for at in (1, 3, 5)
    ]
    return "#" + "".join(f"{part:02x}" for part in parts)


LIGHT = Palette(
    paper="#ffffff",
    ink="#22282f",
    muted="#66707b",
    faint="#8a94a0",
    hypotheses=(
        Stroke("#6b8fb8", "#44678f", "#d3deea", 2.6),
        Stroke("#b0481f", "#a5431c", "#eabfa9", 1.4),
        Stroke("#4f3a6e", "#4f3a6e", "#d6cce3", 1.4, (0, (5, 2))),
        Stroke("#7d7a55", "#66643f", "#dedcc9", 1.4, (0, (2, 1))),
    ),
)

DARK = Palette(
    paper="#14181d",
    ink="#e9edf1",
    muted="#a5b0bc",
    faint="#75808c",
    hypotheses=(
        Stroke("#a3c1e3", "#a3c1e3", "#2b3f57", 2.6),
        Stroke("#d9622f", "#e6794a", "#4d2413", 1.4),
        Stroke("#b79ae0", "#b79ae0", "#3d3152", 1.4, (0, (5, 2))),
        Stroke("#c9c497", "#c9c497", "#454331", 1.4, (0, (2, 1))),
    ),
)


def palette_of(*, is_dark: bool) -> Palette:
    """Return the palette of a theme."""
    return DARK if is_dark else LIGHT
