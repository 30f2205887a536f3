# noqa: INP001 (a script run by hand, in a folder of data)
"""Make the tables of the six invented demonstrations; run by hand: `python data/make.py [FOLDER]`.

Everything comes from fixed seeds, numpy alone, and from the raw bits of PCG64, whose stream numpy promises
never to change; so the same bytes come out wherever and whenever this is run. A test holds it to that.
"""

from __future__ import annotations

import sys
from collections.abc import Mapping
from pathlib import Path

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]

HERE = Path(__file__).parent
SEEDS = {"skerry": 20240611, "tarn": 86, "sorrel": 32, "marram": 1804, "dunlin": 23, "brough": 409}


def uniforms(seed: int, number: int) -> Array:
    """Return that many numbers in [0, 1) from the raw bits of a seed."""
    return np.asarray((np.random.PCG64(seed).random_raw(number) >> np.uint64(11)) * 2.0**-53)


def poisson_quantile(probability: float, mean: float) -> int:
    """Return the count whose cumulative Poisson probability first exceeds a number in [0, 1)."""
    count, term = 0, float(np.exp(-mean))
    total = term
    while total <= probability and term > 0.0:
        count += 1
        term *= mean / count
        total += term
    return count


def drawn(seed: int, expected: Array) -> list[int]:
    """Return Poisson counts, one a bin."""
    return [
        poisson_quantile(float(u), float(mean))
        for u, mean in zip(uniforms(seed, expected.size), expected, strict=True)
    ]


def normal_integrals(edges: Array, mean: float, sd: float) -> Array:
    """Return the part of a normal peak in each bin, by a fine midpoint sum (numpy has no error function)."""
    parts = 2000
    width = np.diff(edges)[:, None] / parts
    at = edges[:-1, None] + (np.arange(parts) + 0.5) * width
    density = np.exp(-0.5 * ((at - mean) / sd) ** 2) / (sd * np.sqrt(2.0 * np.pi))
    return np.asarray((density * width).sum(axis=1))


def exponential_integrals(edges: Array, scale: float) -> Array:
    """Return the part of an exponential in each bin, normalised from the first to the last edge."""
    below = -np.expm1(-(edges - edges[0]) / scale)
    return np.asarray(np.diff(below) / below[-1])


def power_integrals(edges: Array, index: float) -> Array:
    """Return the part of x**-index in each bin, normalised from the first to the last edge."""
    above = edges ** (1.0 - index)
    return np.asarray(np.diff(above) / (above[-1] - above[0]))


def write_table(path: Path, low: Array, high: Array, columns: Mapping[str, npt.ArrayLike]) -> None:
    """Write a histogram table, whole or not at all; counts as integers, templates to four decimals."""
    lines = [",".join(["low", "high", *columns])]
    cells = [np.asarray(column) for column in columns.values()]
    for row, (left, right) in enumerate(zip(low, high, strict=True)):
        values = [f"{cell[row]:d}" if cell.dtype.kind == "i" else f"{cell[row]:.4f}" for cell in cells]
        lines.append(",".join([f"{left:g}", f"{right:g}", *values]))
    write_text(path, "\n".join(lines) + "\n")


def write_text(path: Path, text: str) -> None:
    """Write a file, whole or not at all."""
    path.parent.mkdir(parents=True, exist_ok=True)
    unfinished = path.with_name(path.name + ".unfinished")
    unfinished.write_text(text, encoding="utf-8", newline="\n")
    unfinished.replace(path)


def fakes(edges: Array, events: float, peak: float, stretch: float) -> Array:
    """Return misidentified muons: a hump at low mass with a long tail, its peak and its scale movable."""
    parts = 400
    width = np.diff(edges)[:, None] / parts
    at = (edges[:-1, None] + (np.arange(parts) + 0.5) * width) / stretch
    density = at**3 * np.exp(-3.0 * at / peak)
    per_bin = (density * width).sum(axis=1)
    return np.asarray(events * per_bin / per_bin.sum())


def make_skerry(folder: Path) -> None:
    """Make Skerry: a resonance of 1.2 times its prediction at 45.4 GeV on a falling spectrum."""
    edges = np.linspace(20.0, 80.0, 61)
    low, high = edges[:-1], edges[1:]
    templates = {
        "fakes": fakes(edges, 240.0, 24.0, 1.0),
        "fakes hard": fakes(edges, 250.0, 27.0, 1.0),
        "fakes soft": fakes(edges, 232.0, 21.5, 1.0),
        "fakes stretched": fakes(edges, 243.0, 24.0, 1.03),
        "fakes squeezed": fakes(edges, 237.0, 24.0, 0.97),
    }
    truth = (
        1.04 * 1200.0 * exponential_integrals(edges, 17.8)
        + 0.92 * fakes(edges, 240.0, 24.8, 1.01)
        + 1.2 * 30.0 * normal_integrals(edges, 45.4, 1.2)
    )
    observed = drawn(SEEDS["skerry"], truth)
    write_table(folder / "skerry-peak.csv", low, high, {"observed": observed, **templates})
    write_table(
        folder / "counts.csv",
        low,
        high,
        {
            "observed": observed,
            "continuum": 1200.0 * exponential_integrals(edges, 18.0),
            "fakes": templates["fakes"],
            "signal": 30.0 * normal_integrals(edges, 45.0, 1.2),
        },
    )
    analysis = (HERE / "skerry" / "skerry.toml").read_text(encoding="utf-8")
    held = analysis.replace(
        "its mass and its strength are unknown", "its mass is predicted, its strength is not"
    )
    held = held.replace("resonance at Skerry", "resonance at Skerry, at the predicted mass")
    write_text(folder / "skerry-fixed-mass.toml", held + "fix = { mass = 45.0 }\n")


def make_tarn(folder: Path) -> None:
    """Make Tarn: 3.1 ambient events in 40 keV, some from the surfaces, and no line at all."""
    edges = np.linspace(1290.0, 1330.0, 21)
    low, high = edges[:-1], edges[1:]
    side_low, side_high = np.array([1210.0, 1330.0]), np.array([1290.0, 1410.0])
    surface, side_surface = 0.025 * (1340.0 - low) / 20.0, np.array([3.1, 1.2])
    truth = np.concatenate([3.1 / 20.0 + 0.8 * surface, 3.1 * np.array([2.0, 2.0]) + 0.8 * side_surface])
    observed = drawn(SEEDS["tarn"], truth)
    write_table(folder / "tarn-line.csv", low, high, {"observed": observed[:20], "surface": surface})
    sideband: dict[str, npt.ArrayLike] = {"observed": observed[20:], "surface": side_surface}
    write_table(folder / "tarn-sideband.csv", side_low, side_high, sideband)


def make_sorrel(folder: Path) -> None:
    """Make Sorrel: 3.4 stray muons and 7.5 decays expected in the signal region."""
    low, high = np.array([0.0]), np.array([10.0])
    on, off = drawn(SEEDS["sorrel"], np.array([3.4 + 7.5, 4.0 * 3.4]))
    write_table(folder / "sorrel-signal.csv", low, high, {"observed": [on]})
    write_table(folder / "sorrel-control.csv", low + 10.0, high + 10.0, {"observed": [off]})


def make_marram(folder: Path) -> None:
    """Make Marram: no glow at all, but a spectrum that bends away from its simulation by 9 %."""
    edges = np.linspace(5.0, 45.0, 41)
    templates = {
        "atmospheric": 4800.0 * exponential_integrals(edges, 8.0),
        "atmospheric stretched": 4848.0 * exponential_integrals(edges, 8.08),
        "atmospheric squeezed": 4752.0 * exponential_integrals(edges, 7.92),
    }
    wave = 1.0 - 0.09 * np.cos(np.pi * (0.5 * (edges[1:] + edges[:-1]) - 5.0) / 20.0)
    truth = 4800.0 * wave * exponential_integrals(edges, 8.0)
    counted: dict[str, npt.ArrayLike] = {"observed": drawn(SEEDS["marram"], truth)}
    write_table(folder / "marram-showers.csv", edges[:-1], edges[1:], counted | templates)


def make_dunlin(folder: Path) -> None:
    """Make Dunlin: a spectrum that is neither of its shapes, and half the predicted signal."""
    edges = np.linspace(80.0, 260.0, 46)
    truth = (
        800.0 * exponential_integrals(edges, 62.0)
        + 200.0 * power_integrals(edges, 2.2)
        + 0.5 * 30.0 * normal_integrals(edges, 150.0, 6.0)
    )
    observed = drawn(SEEDS["dunlin"], truth)
    write_table(folder / "dunlin-pairs.csv", edges[:-1], edges[1:], {"observed": observed})


def make_brough(folder: Path) -> None:
    """Make Brough: two levels, the weaker one of two thirds of the typical strength."""
    edges = np.linspace(2.0, 42.0, 41)
    truth = (
        1.03 * 300.0 * exponential_integrals(edges, 16.0)
        + 1.3 * 20.0 * normal_integrals(edges, 13.4, 1.0)
        + 0.75 * 20.0 * normal_integrals(edges, 28.1, 1.0)
    )
    observed = drawn(SEEDS["brough"], truth)
    write_table(folder / "brough-captures.csv", edges[:-1], edges[1:], {"observed": observed})


def main(folder: Path) -> None:
    """Make all six below a folder."""
    make_skerry(folder / "skerry")
    make_tarn(folder / "tarn")
    make_sorrel(folder / "sorrel")
    make_marram(folder / "marram")
    make_dunlin(folder / "dunlin")
    make_brough(folder / "brough")


if __name__ == "__main__":
    main(Path(sys.argv[1]) if len(sys.argv) > 1 else HERE)
