"""What one run of a command found, held together with the analysis and where it came from."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from workbench.ensembles.predictive import PriorPredictive
from workbench.ensembles.results import Adequacy
from workbench.errors import Caution
from workbench.evidence.backgrounds import Backgrounds
from workbench.evidence.breaking.results import BreakPoint
from workbench.evidence.ledger.results import Ledger
from workbench.evidence.prior_choice.results import PriorSensitivity
from workbench.evidence.ratio.results import Average, Scan
from workbench.evidence.results import Comparison, Weighing
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.priors import Prior
from workbench.likelihood.results import Fit


@dataclass(frozen=True, slots=True)
class Origin:
    """Where an outcome came from: what it takes to make it again.

    Attributes:
        file: the input's name as the user gave it; empty for an analysis made in Python.
        digest: "sha256:..." of the analysis file's bytes, or of the analysis' content when there is no file.
        seed: the seed that every random number came from; None where nothing is drawn.
        options: further options of the command that change its numbers, by name.
        notes: sentences on choices made for the user, said in the output.
    """

    file: str
    digest: str
    seed: int | None = 1
    options: Mapping[str, str | float | None] = field(default_factory=dict)
    notes: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, eq=False)
class WeighOutcome:
    """What `weigh` found; fits and adequacies are one a hypothesis, in file order."""

    analysis: Analysis
    origin: Origin
    weighing: Weighing
    adequacies: tuple[Adequacy, ...]
    fits: tuple[Fit, ...]

    @property
    def cautions(self) -> tuple[Caution, ...]:
        """Return what reading and weighing warned of, each once."""
        return tuple(dict.fromkeys((*self.analysis.cautions, *self.weighing.cautions)))


@dataclass(frozen=True, slots=True, eq=False)
class LedgerOutcome:
    """What `ledger` found; fits and adequacies are one a hypothesis, in file order."""

    analysis: Analysis
    origin: Origin
    ledger: Ledger
    adequacies: tuple[Adequacy, ...]
    fits: tuple[Fit, ...]

    @property
    def cautions(self) -> tuple[Caution, ...]:
        """Return what reading, weighing and the ledger warned of, each once."""
        weighing = self.ledger.weighing
        return tuple(dict.fromkeys((*self.ledger.cautions, *self.analysis.cautions, *weighing.cautions)))


@dataclass(frozen=True, slots=True, eq=False)
class CheckOutcome:
    """What `check` found; `adequacies` is empty when nothing was observed yet."""

    analysis: Analysis
    origin: Origin
    predictives: tuple[PriorPredictive, ...]
    adequacies: tuple[Adequacy, ...] = ()


@dataclass(frozen=True, slots=True, eq=False)
class FitOutcome:
    """What `fit` found, one fit a hypothesis in file order."""

    analysis: Analysis
    origin: Origin
    fits: tuple[Fit, ...]


@dataclass(frozen=True, slots=True, eq=False)
class ScanOutcome:
    """What `scan` found."""

    analysis: Analysis
    origin: Origin
    found: Scan


@dataclass(frozen=True, slots=True, eq=False)
class ReadingOutcome:
    """What another prior makes of a saved scan.

    Attributes:
        record: the record's file as the user gave it.
        record_digest: the record's own digest.
        title, file: the title of the analysis that was scanned, and its file.
        found: the scan.
        asked: the priors that the reader gave, by parameter.
        average: the Bayes factor under them.
    """

    record: str
    record_digest: str
    title: str
    file: str
    found: Scan
    asked: Mapping[str, Prior]
    average: Average


@dataclass(frozen=True, slots=True, eq=False)
class BackgroundsOutcome:
    """What `backgrounds` found."""

    analysis: Analysis
    origin: Origin
    found: Backgrounds

    @property
    def cautions(self) -> tuple[Caution, ...]:
        """Return what reading and comparing warned of, each once."""
        return tuple(dict.fromkeys((*self.analysis.cautions, *self.found.cautions)))


@dataclass(frozen=True, slots=True, eq=False)
class BreakPointOutcome:
    """What `breakpoint` found."""

    analysis: Analysis
    origin: Origin
    found: BreakPoint


@dataclass(frozen=True, slots=True, eq=False)
class PriorsOutcome:
    """What `priors` found; adequacies are those of the two hypotheses compared, the other one's first."""

    analysis: Analysis
    origin: Origin
    found: PriorSensitivity
    adequacies: tuple[Adequacy, ...]

    @property
    def cautions(self) -> tuple[Caution, ...]:
        """Return what reading and examining warned of, each once."""
        return tuple(dict.fromkeys((*self.analysis.cautions, *self.found.cautions)))


def spread_of_ln_bayes_factor(comparison: Comparison) -> tuple[float, float] | None:
    """Return the lowest and highest ln B over the declared, halved and doubled strength priors.

    Args:
        comparison: one hypothesis against the first.

    Returns:
        Two numbers [nats], or None where no width could be scaled or ln B is missing.
    """
    if comparison.ln_bayes_factor is None:
        return None
    scaled = [value for item in comparison.sensitivity for value in (item.halved, item.doubled)]
    known = [value for value in scaled if value is not None]
    if not known:
        return None
    return min(comparison.ln_bayes_factor, *known), max(comparison.ln_bayes_factor, *known)
