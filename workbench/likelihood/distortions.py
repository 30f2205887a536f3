"""Smooth distortions of the backgrounds: their functions, as sources of a model, and as a truth that is held.

The functions are made along the share u of the region's expected background that lies below: equal steps of u
hold equal numbers of events, so that a term moves no bin by more than sqrt(2 k - 1) times its rms, however
steeply the background falls. Polynomials of the axis itself would move the last bins of a falling spectrum by
many times their rms.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np
import numpy.typing as npt
from numpy.polynomial import legendre

from workbench.errors import InputError, Problem, quoted
from workbench.hypotheses.jets import Jet
from workbench.likelihood.parts import Sources, Stem

if TYPE_CHECKING:  # the model asks this module for its distortion
    from workbench.likelihood.model import Model

Array = npt.NDArray[np.float64]


def smooth_functions(background: Array, terms: int) -> Array:
    """Return the smooth functions of a region, orthonormal over its expected background.

    With u the share of the background below a place, and P_k the Legendre polynomials:
        f_k(u) = sqrt(2 k - 1) P_{k-1}(2 u - 1),   integral of f_j f_k du = 1 if j = k, else 0
    and in a bin the mean of f_k over the bin's own share, so that sum_i b_i f_ij f_ik / sum_i b_i is the same
    but for the part that is lost inside bins: little where a bin holds a small part of the background.

    Args:
        background: (bin,) expected background events [events]; >= 0, their sum > 0.
        terms: how many functions, the constant f_1 = 1 counted.

    Returns:
        (term, bin) values.

    Source:
        Legendre polynomials, orthogonal over a uniform variable; their use along u is a definition.
    """
    share = np.concatenate([[0.0], np.cumsum(background)]) / background.sum()
    nodes, weights = legendre.leggauss(terms // 2 + 1)
    middle, half = 0.5 * (share[1:] + share[:-1]), 0.5 * np.diff(share)
    along = 2.0 * (middle[:, None] + half[:, None] * nodes) - 1.0
    values = legendre.legvander(along, terms - 1) * np.sqrt(2.0 * np.arange(terms) + 1.0)
    return np.asarray(0.5 * np.einsum("inf,n->fi", values, weights))


def nominal_background(model: Model) -> Array:
    """Return (bin,) expected background events at the median of every parameter, every source at 0."""
    backgrounds = model.restricted("background", spare=False)
    expected, _ = backgrounds.expected(backgrounds.seeds(np.zeros((1, model.size))))
    return np.asarray(expected[0])


def region_functions(model: Model, region: str, terms: int) -> tuple[slice, Array]:
    """Return where a region's bins stand among all bins, and its (term, bin) smooth functions.

    Args:
        model: a hypothesis.
        region: the region's name.
        terms: how many functions.

    Returns:
        The bins and the functions.

    Raises:
        InputError: if fewer bins hold background than there are terms.
    """
    bins, filled = region_bins(model)[region], filled_bins(model)[region]
    if filled < terms:
        raise InputError(
            Problem(
                "More terms of a distortion than bins with background",
                f"hypothesis {quoted(model.hypothesis)}, region {quoted(region)}",
                f"{terms} terms, {filled} bins in which background is expected",
                "at most one term a bin",
                f"ask for {filled} terms, or leave the region out" if filled else "leave the region out",
            )
        )
    return bins, smooth_functions(nominal_background(model)[bins], terms)


def filled_bins(model: Model) -> dict[str, int]:
    """Return region to the number of its bins in which background is expected."""
    nominal = nominal_background(model)
    return {region: int(np.count_nonzero(nominal[bins])) for region, bins in region_bins(model).items()}


def region_bins(model: Model) -> dict[str, slice]:
    """Return region to where its bins stand among all bins."""
    found, start = {}, 0
    for region in model.analysis.regions:
        found[region.name] = slice(start, start + region.table.binning.number)
        start = found[region.name].stop
    return found


def with_distortion(model: Model) -> Model:
    """Return the model with its hypothesis' distortion as sources of every background, if it has one."""
    distortion = model.analysis.hypothesis(model.hypothesis).distortion
    if distortion is None:
        return model
    step = float(np.log1p(distortion.size))
    found: dict[int, Sources] = {}
    for region, names in model.analysis.distorted_regions(model.hypothesis).items():
        bins, functions = region_functions(model, region, distortion.terms)
        indices = np.array([model.names.index(name) for name in names], dtype=np.intp)
        found[bins.start] = Sources(indices, step * functions, np.zeros_like(functions), is_bent=False)
    parts = tuple(
        replace(part, by_bin=_joined(part.by_bin, found[part.bins.start]))
        if part.bins.start in found and not model.analysis.process(part.process).is_signal
        else part
        for part in model.parts
    )
    return replace(model, parts=parts)


def resized(model: Model, factor: float) -> Model:
    """Return the model with its distortion's size, the ln of one step up, multiplied by a factor."""
    terms = {name for names in model.analysis.distorted_regions(model.hypothesis).values() for name in names}
    places = [model.names.index(name) for name in model.names if name in terms]
    parts = []
    for part in model.parts:
        by_bin = part.by_bin
        if by_bin is not None:
            scale = np.where(np.isin(by_bin.indices, places), factor, 1.0)[:, None]
            by_bin = replace(by_bin, linear=scale * by_bin.linear)
        parts.append(replace(part, by_bin=by_bin))
    return replace(model, parts=tuple(parts))


def held_distortion(model: Model, factors: Array) -> Model:
    """Return the model with every background multiplied by (bin,) factors, as if that were the truth."""
    parts = tuple(
        part
        if model.analysis.process(part.process).is_signal
        else replace(
            part,
            stem=_multiplied(part.stem, factors[part.bins]),
            error=None if part.error is None else _multiplied(part.error, factors[part.bins]),
        )
        for part in model.parts
    )
    return replace(model, parts=parts)


def _multiplied(stem: Stem, factors: Array) -> Stem:
    fixed = None if stem.fixed_core is None else stem.fixed_core * factors

    def core(arguments: Mapping[str, Jet]) -> Jet:
        return stem.core(arguments) * factors

    return replace(stem, core=core, fixed_core=fixed)


def _joined(first: Sources | None, second: Sources) -> Sources:
    if first is None:
        return second
    return Sources(
        np.concatenate([first.indices, second.indices]),
        np.concatenate([first.linear, second.linear]),
        np.concatenate([first.bend, second.bend]),
        first.is_bent,
    )
