"""Backgrounds with alternatives: the ledger is that of the averages, by hand where nothing is unknown."""

from __future__ import annotations

from dataclasses import replace
from itertools import permutations

import numpy as np
import numpy.typing as npt
import pytest
from scipy import stats

from tests.evidence.small_analyses import several_bins, source, templates
from workbench.evidence.ledger.ledger import ledger
from workbench.evidence.weigh import weigh
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.priors import Exponential, Fixed, Prior
from workbench.hypotheses.processes import Alternative, Contribution
from workbench.hypotheses.shapes import Template

Array = npt.NDArray[np.float64]

OBSERVED = np.array([7, 12, 5])
FLAT, STEEP, SIGNAL = np.array([6.0, 6.0, 6.0]), np.array([10.0, 7.0, 3.0]), np.array([0.5, 4.0, 1.0])
PRIORS = (0.75, 0.25)


def in_doubt(strength: Prior, size: float | None = None) -> Analysis:
    """Return a background that is flat or steep, and a signal."""
    columns = {"background": FLAT.tolist(), "signal": SIGNAL.tolist()}
    sources = () if size is None else (source("size", background=size),)
    analysis = templates(several_bins("r", OBSERVED.tolist(), columns), strength, sources)
    (region,) = analysis.regions
    table = replace(region.table, columns=dict(region.table.columns) | {"steep": STEEP}, digest="")
    alternatives = tuple(
        Alternative(name, {"r": Contribution(Template(column))}, prior)
        for name, prior, column in zip(("flat", "steep"), PRIORS, ("background", "steep"), strict=True)
    )
    processes = tuple(
        replace(one, regions={}, alternatives=alternatives) if one.name == "background" else one
        for one in analysis.processes
    )
    return replace(analysis, regions=(replace(region, table=table),), processes=processes)


def ln_bayes_factor(bins: tuple[int, ...]) -> float:
    """Return ln B of some bins at strength 1: averages of products of Poisson probabilities (scipy)."""
    chosen = list(bins)
    zero, one = (
        sum(
            prior * np.prod(stats.poisson.pmf(OBSERVED[chosen], (shape + extra)[chosen]))
            for prior, shape in zip(PRIORS, (FLAT, STEEP), strict=True)
        )
        for extra in (np.zeros(3), SIGNAL)
    )
    return float(np.log(one / zero))


def test_shares_of_an_average_are_those_of_the_average() -> None:
    """All six orders by hand; the bins are not independent, since they tell which alternative holds."""
    shares = np.zeros(3)
    for order in permutations(range(3)):
        for place, index in enumerate(order):
            shares[index] += ln_bayes_factor(order[: place + 1]) - ln_bayes_factor(order[:place])
    (account,) = ledger(in_doubt(Fixed(1.0)), orders=200).accounts
    assert account.shares is not None
    assert account.shares.total == pytest.approx(ln_bayes_factor((0, 1, 2)), abs=1e-12)
    for index, part in enumerate(account.bins):
        others = tuple(one for one in range(3) if one != index)
        assert part.without == pytest.approx(ln_bayes_factor(others), abs=1e-12)
        assert part.share is not None
        assert part.sampling_error is not None
        assert part.sampling_error < 1e-12
        assert abs(part.share - shares[index] / 6.0) < 4.0 * (part.order_error or 0.0)
    assert max(part.order_error or 0.0 for part in account.bins) > 1e-4


def test_an_average_with_unknowns_adds_up_and_agrees_with_weighing() -> None:
    analysis = in_doubt(Exponential(1.0), size=0.2)
    (account,) = ledger(analysis, orders=8).accounts
    (comparison,) = weigh(analysis).comparisons
    assert account.established
    assert account.shares is not None
    assert account.shares.total is not None
    error = np.hypot(account.shares.total_error or 0.0, comparison.ln_bayes_factor_error or 0.0)
    assert abs(account.shares.total - (comparison.ln_bayes_factor or 0.0)) < 4.0 * error
    assert sum(part.share or 0.0 for part in account.bins) == pytest.approx(account.shares.total, abs=1e-12)
    (size,) = account.uncertainties
    (frozen,) = weigh(in_doubt(Exponential(1.0))).comparisons
    assert size.frozen is not None
    assert size.frozen_error is not None
    assert frozen.ln_bayes_factor is not None
    both = np.hypot(size.frozen_error, frozen.ln_bayes_factor_error or 0.0)
    assert abs(size.frozen - frozen.ln_bayes_factor) < 4.0 * both + 1e-9
