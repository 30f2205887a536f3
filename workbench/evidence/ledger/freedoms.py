"""The uncertainties of a hypothesis, and the hypothesis with one of them frozen or doubled."""

from __future__ import annotations

from dataclasses import dataclass, replace

from workbench.errors import InputError
from workbench.evidence.ledger.doubling import doubled_source
from workbench.hypotheses.analysis import EXPOSURE_SOURCE, Analysis
from workbench.likelihood.distortions import resized
from workbench.likelihood.model import Model, compile_model

SOURCE, NUISANCE, DISTORTION = "source", "nuisance parameter", "distortion"
_DISTORTION_NAME = "smooth distortion"


@dataclass(frozen=True, slots=True)
class Freedom:
    """One uncertainty of a hypothesis.

    Attributes:
        name: the source or nuisance parameter; "smooth distortion" for all terms of one together.
        kind: "source", "nuisance parameter" or "distortion".
        place: its coordinate's place; that of a distortion's first term.
    """

    name: str
    kind: str
    place: int


def freedoms_of(model: Model) -> list[Freedom]:
    """Return every source and nuisance parameter of a hypothesis, its smooth distortion last and as one."""
    distorted = model.analysis.distorted_regions(model.hypothesis).values()
    terms = {name for names in distorted for name in names}
    found = [
        Freedom(one.name, SOURCE if one.role == "source" else NUISANCE, place)
        for place, one in enumerate(model.coordinates)
        if one.role != "signal" and one.name not in terms
    ]
    if terms:
        first = next(place for place, name in enumerate(model.names) if name in terms)
        found.append(Freedom(_DISTORTION_NAME, DISTORTION, first))
    return found


def frozen(model: Model, freedom: Freedom) -> Analysis:
    """Return the analysis without an uncertainty: a source at z = 0, a nuisance parameter at its median."""
    analysis, name = model.analysis, freedom.name
    if freedom.kind == DISTORTION:
        undistorted = tuple(replace(one, distortion=None) for one in analysis.hypotheses)
        return replace(analysis, hypotheses=undistorted)
    if freedom.kind == NUISANCE:
        median = float(model.coordinates[freedom.place].prior.median)
        hypotheses = tuple(
            replace(one, fix={**one.fix, name: median}) if name in analysis.parameters_used(one.name) else one
            for one in analysis.hypotheses
        )
        return replace(analysis, hypotheses=hypotheses)
    if name == EXPOSURE_SOURCE and analysis.exposure is not None:
        return replace(analysis, exposure=replace(analysis.exposure, uncertainty=None))
    return replace(analysis, uncertainties=tuple(one for one in analysis.uncertainties if one.name != name))


def doubled(model: Model, freedom: Freedom) -> Model | None:
    """Return the hypothesis with an uncertainty twice as large.

    Args:
        model: the compiled hypothesis.
        freedom: one of its uncertainties.

    Returns:
        The hypothesis, with every factor that a source makes squared, the size of a distortion doubled, or
        the prior of a nuisance parameter twice as wide; None where that has no width to be worked with.
    """
    if freedom.kind == DISTORTION:
        return resized(model, 2.0)
    try:
        if freedom.kind == SOURCE:
            return compile_model(doubled_source(model.analysis, freedom.name), model.hypothesis)
        prior = model.coordinates[freedom.place].prior.scaled(2.0)
    except InputError:  # too large to be worked with
        return None
    if prior is None:
        return None
    coordinates = list(model.coordinates)
    coordinates[freedom.place] = replace(coordinates[freedom.place], prior=prior)
    return replace(model, coordinates=tuple(coordinates))
