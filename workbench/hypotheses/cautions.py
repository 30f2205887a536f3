"""What is worth knowing about an analysis that can be used."""

from __future__ import annotations

import itertools
from collections.abc import Iterator
from typing import TYPE_CHECKING

import numpy as np
import numpy.typing as npt

from workbench.counts.binning import Binning
from workbench.counts.region import Region
from workbench.counts.table import ERROR_ENDING
from workbench.errors import Caution, quoted
from workbench.hypotheses.effects import regions_acted_on
from workbench.hypotheses.faults import dotted, shown
from workbench.hypotheses.shapes import Template, Templates
from workbench.hypotheses.uncertainties import Effect, Uncertainty

if TYPE_CHECKING:  # only for annotations: what is read is an analysis, whoever made it
    from workbench.hypotheses.analysis import Analysis

Array = npt.NDArray[np.float64]
CENTRAL = (0.1587, 0.8413)  # the part of a peak that is called its width: two sd of a normal one


def cautions_of(analysis: Analysis) -> tuple[Caution, ...]:
    """Return the cautions that follow from what an analysis says, wherever it came from.

    Args:
        analysis: the analysis.

    Returns:
        Cautions about template columns, hypotheses, held numbers, interpolated templates and uncertainties.

    Source:
        none, definition; one-sided uncertainties are common practice, no source.
    """
    return (
        *_regions(analysis),
        *_hypotheses(analysis),
        *_held(analysis),
        *_spaced_templates(analysis),
        *_one_sided(analysis),
        *_variations(analysis),
    )


def _regions(analysis: Analysis) -> Iterator[Caution]:
    for region in analysis.regions:
        if region.table.errors and region.template_errors is None:
            columns = ", ".join(quoted(column + ERROR_ENDING) for column in region.table.errors)
            yield Caution(
                "template-errors-unused",
                f"{region.table.source} has error columns ({columns}) that are not used: "
                f"write template_errors = true or false in {dotted(('regions', region.name))}.",
            )
        yield from region.cautions


def _hypotheses(analysis: Analysis) -> Iterator[Caution]:
    first = analysis.hypotheses[0]
    signals = [process.name for process in analysis.processes_of(first.name) if process.is_signal]
    if signals:
        yield Caution(
            "first-hypothesis-has-signal",
            f"Everything is compared with the first hypothesis, {quoted(first.name)}, which is not "
            f"background only: it contains the signal {', '.join(quoted(name) for name in signals)}.",
        )
    if first.distortion is not None:
        yield Caution(
            "first-hypothesis-distorted",
            f"Everything is compared with the first hypothesis, {quoted(first.name)}, whose backgrounds may "
            "be distorted: ln B is not against the background as declared.",
        )
    if not any(process.is_signal for process in analysis.processes):
        yield Caution("no-signal", "No process is a signal: there is nothing to search for.")


def _held(analysis: Analysis) -> Iterator[Caution]:
    for hypothesis in analysis.hypotheses:
        for name, number in hypothesis.fix.items():
            prior = analysis.parameter(name).prior
            low, high = prior.support
            if low < high and not low <= number <= high:
                yield Caution(
                    "held-outside-prior",
                    f"{quoted(hypothesis.name)} holds {quoted(name)} at {shown(number)}, where its prior "
                    f"({prior.text()}) has no probability.",
                )


def _spaced_templates(analysis: Analysis) -> Iterator[Caution]:
    for process in analysis.processes:
        for description in process.descriptions:
            name, shape = description.region, description.contribution.shape
            table = analysis.region(name).table
            if not isinstance(shape, Templates):
                continue
            peaks = [_centre_and_width(table.binning, table.columns[column]) for column in shape.columns]
            for (left, right), (a, b) in zip(
                itertools.pairwise(shape.at), itertools.pairwise(peaks), strict=True
            ):
                if a is not None and b is not None and abs(b[0] - a[0]) > max(a[1], b[1]):
                    yield Caution(
                        "templates-spaced-wide",
                        f"The templates of {quoted(process.name)} in {quoted(name)} at {shown(left)} and "
                        f"{shown(right)} lie {abs(b[0] - a[0]):.3g} apart, wider than the peak "
                        f"({max(a[1], b[1]):.3g}): between them the interpolation has two peaks instead of "
                        "one. Give templates in between.",
                    )
                    break


def _centre_and_width(binning: Binning, events: Array) -> tuple[float, float] | None:
    """Return the median and the central width of a template; None where it is empty."""
    total = float(events.sum())
    if not (0.0 < total < np.inf):
        return None
    cumulative = np.concatenate([[0.0], np.cumsum(events / total)])
    place = [_quantile(binning, cumulative, part) for part in (0.5, *CENTRAL)]
    return place[0], place[2] - place[1]


def _quantile(binning: Binning, cumulative: Array, part: float) -> float:
    """Return where a part of the events lies below, evenly spread inside each bin."""
    bin_number = int(np.clip(np.searchsorted(cumulative, part) - 1, 0, binning.number - 1))
    below, inside = cumulative[bin_number], cumulative[bin_number + 1] - cumulative[bin_number]
    fraction = float((part - below) / inside) if inside > 0 else 0.5
    low, high = float(binning.low[bin_number]), float(binning.high[bin_number])
    return low + fraction * (high - low)


def _one_sided(analysis: Analysis) -> Iterator[Caution]:
    for source in analysis.uncertainties:
        for effect in source.effects:
            up, down = effect.up, effect.down
            if isinstance(up, str) or isinstance(down, str) or down is None:
                continue
            if up * down > 0:
                yield _one_sided_caution(source, effect, f"up = {shown(up)} and down = {shown(down)}")


def _one_sided_caution(source: Uncertainty, effect: Effect, sizes: str) -> Caution:
    return Caution(
        "one-sided-uncertainty",
        f"{quoted(source.name)} moves {quoted(effect.process)} to the same side both ways ({sizes}): "
        "the source can hardly be measured, and its posterior may have two peaks. If one side stands for the "
        f"size alone, write one number: effects.{dotted((effect.process,))} = ...",
    )


def _variations(analysis: Analysis) -> Iterator[Caution]:
    """Yield cautions about template variations: one-sided ones, and bins that take the additive form."""
    for source in analysis.uncertainties:
        for effect in source.effects:
            process = analysis.process(effect.process)
            for name in regions_acted_on(effect, source, process):
                if isinstance(effect.up, str) and isinstance(effect.down, str):
                    columns = dict.fromkeys(
                        one.contribution.shape.column
                        for one in process.descriptions
                        if one.region == name and isinstance(one.contribution.shape, Template)
                    )
                    for column in columns:
                        yield from _variation(source, effect, analysis.region(name), column)


def _variation(source: Uncertainty, effect: Effect, region: Region, column: str) -> Iterator[Caution]:
    nominal = region.table.columns[column]
    up, down = region.table.columns[str(effect.up)], region.table.columns[str(effect.down)]
    with np.errstate(over="ignore", invalid="ignore"):
        moved = float(up.sum() - nominal.sum()), float(down.sum() - nominal.sum())
        smallest = 1e-9 * float(nominal.sum())
    if min(moved) > smallest or max(moved) < -smallest:
        yield _one_sided_caution(
            source, effect, f"by {moved[0]:+.3g} and {moved[1]:+.3g} events in {quoted(region.name)}"
        )
    is_empty = (nominal == 0) & (up == 0) & (down == 0)
    is_additive = ~is_empty & ((nominal <= 0) | (up <= 0) | (down <= 0))
    number = int(is_additive.sum())
    if number:
        yield Caution(
            "additive-variation",
            f"{quoted(source.name)} varies {quoted(column)} in {quoted(region.name)} additively in {number} "
            f"of {nominal.size} bins, where the nominal or a varied column is 0 and ratios do not exist.",
        )
