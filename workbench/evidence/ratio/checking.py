"""What the surface is held against: background only, and the engine at points between its nodes."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from workbench.errors import quoted
from workbench.evidence.ratio.held import FAILED, Held, Holder
from workbench.evidence.ratio.results import Check, Scan
from workbench.evidence.ratio.surface import Surface
from workbench.evidence.ratio.variants import Part, ratio_of
from workbench.evidence.weigh import Weighed, weigh_hypothesis
from workbench.likelihood.model import Model, compile_model

Array = npt.NDArray[np.float64]

_ALIKE = 1e-9  # relative, of two ln likelihoods
_POINTS = 8
_FEWER = 3  # where one takes long
_LONG = 200_000  # bins x coordinates
_DEPTH = 8.0
_ALLOWED = 0.05
_UNLIKELY = 2.0  # a mean square pull
_FAR_OUT, _USUAL = 3.5, 2.5  # the largest pull of a few


@dataclass(frozen=True, slots=True, eq=False)
class Anchor:
    """Where R's scale comes from.

    Attributes:
        reference: the point without signal; None where no strength can be 0.
        is_nested: True where the hypothesis is background only there, so that R is 1.
    """

    reference: Held | None
    is_nested: bool


def anchor_of(holder: Holder, first: Weighed) -> Anchor:
    """Return the point without signal, and whether it is background only.

    Args:
        holder: the hypothesis with its signal parameters held.
        first: the background-only hypothesis.
    """
    model = holder.model
    strengths = [model.coordinates[index].is_strength for index in model.signal]
    ends = [model.coordinates[index].prior.support for index in model.signal]
    if not any(strengths) or any(
        is_one and low > 0.0 for is_one, (low, _) in zip(strengths, ends, strict=True)
    ):
        return Anchor(None, False)
    values = np.array([[0.0 if s else 0.5 * (a + b) for s, (a, b) in zip(strengths, ends, strict=True)]])
    reference = holder.at(values, np.zeros((1, holder.integrand.nuisance.size)), lambda found: found > FAILED)
    return Anchor(reference, _is_nested(holder, values, first.model))


def _is_nested(holder: Holder, values: Array, first: Model) -> bool:
    """Tell whether both hypotheses expect the same counts without signal, wherever the others stand."""
    model = holder.model
    if not set(first.names) <= set(model.names):
        return False
    rest = {c.name: c.prior for c in first.coordinates}
    own = {c.name: c.prior for c in model.coordinates if c.name in rest}
    points = np.random.default_rng(0).normal(size=(5, model.size))
    points[:, model.signal] = holder.standard(values)
    where = [model.names.index(name) for name in first.names]
    with np.errstate(all="ignore"):
        here = model.expected(model.seeds(points))
        there = first.expected(first.seeds(points[:, where]))
    pairs = [(a, b) for a, b in zip(here, there, strict=True) if a is not None or b is not None]
    alike = all(a is not None and b is not None and np.allclose(a, b, rtol=_ALIKE) for a, b in pairs)
    return own == rest and alike


def shift_of(first: Weighed, reference: Held) -> tuple[float, float]:
    """Return ln of the reference point's marginal likelihood over that of background only, and its error."""
    spread = reference.corrections.std(axis=1, ddof=1)[0] / np.sqrt(reference.corrections.shape[1])
    doubt = float(spread / reference.corrections.mean())
    other = first.evidence
    if other.ln_evidence is None:
        return 0.0, doubt
    return float(reference.ln_evidence[0]) - other.ln_evidence, float(np.hypot(doubt, other.error or 0.0))


def checks_of(parts: Sequence[Part], surface: Surface, seed: np.random.SeedSequence) -> tuple[Check, ...]:
    """Return R between the nodes as the engine has it with the signal parameters held.

    Args:
        parts: the alternatives of the backgrounds, or the one analysis.
        surface: R over all signal parameters.
        seed: where points and draws come from.
    """
    model = parts[0].weighed.model
    is_long = len(parts) * model.bins * max(1, model.size) > _LONG
    chooser, *children = seed.spawn((_FEWER if is_long else _POINTS) + 1)
    points = _points(surface, len(children), np.random.default_rng(chooser))
    values, errors = surface.at(points)
    found = []
    for point, value, error, child in zip(points, values, errors, children, strict=True):
        held = dict(zip(surface.names, point.tolist(), strict=True))
        its_own = zip(parts, child.spawn(len(parts)), strict=True)
        evidences = [_held_evidence(part, held, one).evidence for part, one in its_own]
        direct = ratio_of(parts, evidences)
        if direct is not None and all(one.established for one in evidences):
            found.append(Check(held, float(value), float(error), direct.ln_ratio, direct.error))
    return tuple(found)


def _held_evidence(part: Part, values: dict[str, float], seed: np.random.SeedSequence) -> Weighed:
    name = part.weighed.model.hypothesis
    changed = tuple(
        replace(one, fix={**one.fix, **values}) if one.name == name else one
        for one in part.analysis.hypotheses
    )
    return weigh_hypothesis(compile_model(replace(part.analysis, hypotheses=changed), name), seed)


def _points(surface: Surface, number: int, generator: np.random.Generator) -> Array:
    """Return points off the nodes: half of them about the peak, all where R is not negligible."""
    ranges = np.array(list(surface.ranges.values()))
    top = surface.nodes.reshape(-1, len(ranges))[int(np.argmax(surface.ln_ratio))]
    spacing = np.array([np.diff(one.nodes).max() for one in surface.panels])
    found: list[Array] = []
    while len(found) < number:
        points = generator.uniform(ranges[:, 0], ranges[:, 1], size=(256, len(ranges)))
        if len(found) % 2 == 0 and spacing.size:
            near = top[: spacing.size] + spacing * generator.uniform(-1.0, 1.0, size=(256, spacing.size))
            points[:, : spacing.size] = np.clip(near, ranges[: spacing.size, 0], ranges[: spacing.size, 1])
        if surface.strengths is not None:
            low, high = surface.strengths.low, surface.strengths.high
            points[:, -1] = low + (high - low) * generator.random(256) ** 3
        values = surface.at(points)[0]
        floor = min(float(values.max()), max(float(surface.ln_ratio.max()), 0.0) - _DEPTH)
        found.append(points[int(np.flatnonzero(values >= floor)[0])])
    return np.array(found)


def scale_of(checks: tuple[Check, ...]) -> float:
    """Return what errors are multiplied by: more than 1 where the checks differ by more than they say."""
    if not checks:
        return 1.0
    pulls = np.abs([one.pull for one in checks])
    mean, worst = float(np.mean(pulls**2)), float(pulls.max())
    together = float(np.sqrt(mean)) if mean > _UNLIKELY else 1.0
    return max(together, worst / _USUAL if worst > _FAR_OUT else 1.0)


def widened(found: Scan) -> Scan:
    """Return the scan with its errors as large as the checks say that they have to be."""
    scale, surface = scale_of(found.checks), found.known
    checks = tuple(replace(one, error=scale * one.error) for one in found.checks)
    return replace(found, surface=replace(surface, error=scale * surface.error), checks=checks)


def disagreement(found: Scan, surface: Surface, parts: Sequence[Part]) -> str:
    """Return why a scan is not established; empty when it is.

    Args:
        found: the scan.
        surface: R over all signal parameters.
        parts: the alternatives of the backgrounds, or the one analysis.
    """
    for one in (one for part in parts for one in (part.first, part.weighed)):
        if not one.evidence.established:
            return f"{quoted(one.model.hypothesis)}: {one.evidence.reason}"
    near = surface.ln_ratio > surface.ln_ratio.max(axis=1, keepdims=True) - _DEPTH
    if not np.isfinite(surface.ln_ratio[near]).all() or (surface.ln_ratio.max(axis=1) < 0.5 * FAILED).any():
        return (
            "the nuisance parameters have no maximum that could be integrated around somewhere in the range"
        )
    for check in found.checks:
        gap = abs(check.ln_ratio - check.direct)
        limit = _ALLOWED + 3.0 * float(np.hypot(check.error, check.direct_error))
        if not gap <= limit:
            where = ", ".join(f"{name} {value:.4g}" for name, value in check.values.items())
            return f"ln R at {where} differs by {gap:.2g} from a direct evaluation, more than {limit:.2g}"
    average = found.reprior()
    gap = abs(average.ln_bayes_factor - (found.ln_bayes_factor or 0.0))
    limit = _ALLOWED + 3.0 * float(np.hypot(average.error, found.ln_bayes_factor_error or 0.0))
    if not gap <= limit:
        return f"its average over the stated priors differs from ln B by {gap:.2g}, more than {limit:.2g}"
    return ""
