"""A toy experiment: pseudo-data of a known truth that grow with exposure, the truth kept back."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cached_property

import numpy as np
import numpy.typing as npt

from workbench.ensembles.growth import Growth
from workbench.ensembles.truths import Truth, true_model
from workbench.hypotheses.accumulated import at_exposure, refuse_exposure, stated_exposure, with_counts
from workbench.hypotheses.analysis import Analysis
from workbench.likelihood.laws import noisy_bins

Array = npt.NDArray[np.float64]

_NOTHING: Mapping[str, float] = {}
_STREAM = 5  # of the seed, this file's own
_EVENTS, _TEMPLATES = 0, 1
_LARGEST_SHAPE = 1e300


@dataclass(frozen=True, eq=False)
class Toy:
    """One toy experiment.

    Attributes:
        analysis: the scenario, whose observed counts are not used.
        seed: where everything that was drawn comes from.
        truth: what the pseudo-data were made from; not shown by `repr`.
        whole: (bin,) expected events of what does not follow exposure [events].
        rates: (bin,) expected events of what does, at the stated exposure [events].
    """

    analysis: Analysis
    seed: int
    truth: Truth = field(repr=False)
    whole: Array = field(repr=False)
    rates: Array = field(repr=False)

    def counts(self, exposure: float) -> Array:
        """Return (bin,) pseudo-data up to an exposure, all regions' bins in order [events].

        Args:
            exposure: in the analysis' unit; > 0.

        Returns:
            Counts; those at any smaller exposure are among them, whatever the steps.

        Raises:
            InputError: if the exposure is no positive number.
        """
        refuse_exposure(exposure)
        return self._at_once + self._growth.counts(exposure / stated_exposure(self.analysis))

    def at(self, exposure: float) -> Analysis:
        """Return the analysis of the pseudo-data up to an exposure.

        Args:
            exposure: in the analysis' unit; > 0.

        Returns:
            The analysis with these counts, and with what it expects at that exposure.

        Raises:
            InputError: if the exposure is no positive number, or counts are too large to be kept exactly.
        """
        source = f"pseudo-data of seed {self.seed}"
        return at_exposure(with_counts(self.analysis, self.counts(exposure), source), exposure)

    @cached_property
    def _growth(self) -> Growth:
        return Growth(self.rates, np.random.SeedSequence(self.seed, spawn_key=(_STREAM, _EVENTS, 0)))

    @cached_property
    def _at_once(self) -> Array:
        """Return (bin,) counts of what is there from the start."""
        events = Growth(self.whole, np.random.SeedSequence(self.seed, spawn_key=(_STREAM, _EVENTS, 1)))
        return events.counts(1.0)


@np.errstate(all="ignore")  # expectations beyond what can be drawn are drawn at the largest mean
def toy(
    analysis: Analysis,
    *,
    hypothesis: str | None = None,
    true: Mapping[str, float] = _NOTHING,
    alternative: str | None = None,
    seed: int = 1,
) -> Toy:
    """Return a toy experiment of a scenario, whose pseudo-data grow with exposure.

    Events are those of a Poisson process along exposure. A process that does not follow exposure enters whole
    at the start. With template errors each bin's expectation has one gamma-distributed factor, of mean 1 and
    variance V/T^2, for the whole run.

    Args:
        analysis: the scenario.
        hypothesis: the one that is true; None for the last.
        true: true values by name of a parameter or a source; what is left out is drawn from its prior. A
            source's is in standard deviations.
        alternative: which alternative of the backgrounds is true; None draws one.
        seed: where everything that is drawn comes from; the draws of what is left out stay as they are
            whatever else is set.

    Returns:
        The experiment, its truth kept back in `truth`.

    Raises:
        InputError: if there is no such hypothesis, parameter, source or alternative, or a true value makes an
            expected count negative.

    Limits:
        In a bin where one process follows exposure and another does not, the factor for template errors is
        that of the stated exposure: the likelihood's law holds there exactly, and nearly at others.

    Source:
        none, definition
    """
    model, truth = true_model(analysis, hypothesis, true, alternative, seed)
    values = np.array([[truth.values[name] for name in model.names]])
    seeds = model.natural_seeds(values)
    factor = _template_factor(*model.expected(seeds), seed)
    following = {process.name for process in analysis.processes if process.follows_exposure}
    whole, rates = np.array(model.spare), np.zeros(model.bins)
    for name, events in model.by_process(seeds).items():
        part = rates if name in following else whole
        part += events[0]
    whole, rates = (np.maximum(np.nan_to_num(part * factor), 0.0) for part in (whole, rates))
    return Toy(analysis, seed, truth, whole, rates)


def _template_factor(total: Array, variance: Array | None, seed: int) -> Array:
    """Return (bin,) one factor of mean 1 for each bin; 1 where the template is exact."""
    if variance is None:
        return np.ones(total.shape[1])
    noisy = noisy_bins(total, variance)
    shape = np.where(noisy, total**2 / np.where(noisy, variance, 1.0), 1.0)
    shape = np.clip(np.nan_to_num(shape), 1.0 / _LARGEST_SHAPE, _LARGEST_SHAPE)
    stream = np.random.SeedSequence(seed, spawn_key=(_STREAM, _TEMPLATES))
    drawn = np.random.default_rng(stream).gamma(shape) / shape
    return np.asarray(np.where(noisy, drawn, 1.0)[0])
