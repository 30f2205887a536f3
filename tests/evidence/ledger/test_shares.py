"""Shares of a Bayes factor: exact where they can be, right within their errors, and summing to the whole."""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise, permutations

import numpy as np
import numpy.typing as npt
import pytest

from tests.evidence.ledger import enumerated
from tests.evidence.small_analyses import TAU, YIELD, bump, counting, several_bins, templates
from tests.evidence.wrong_proposal import Wrong
from workbench.evidence.formulas.closed_forms import (
    ln_gamma_background,
    ln_on_off_background,
    ln_on_off_signal,
)
from workbench.evidence.formulas.count_mixtures import ln_gamma_mixture
from workbench.evidence.ledger.bridge import Bridge, Rungs, bridge, powers_for, rungs_of
from workbench.evidence.ledger.chain import Chain, chain, sampling_errors
from workbench.evidence.ledger.ledger import ledger
from workbench.evidence.ledger.orders import random_orders
from workbench.evidence.ledger.shares import split
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.priors import Exponential, Fixed, Gamma
from workbench.likelihood.model import compile_model

Array = npt.NDArray[np.float64]
Indices = npt.NDArray[np.intp]

SIGNAL = "signal plus background"
LEVEL = Gamma(shape=1.5, rate=0.1)


def all_orders(bins: int) -> Indices:
    """Return every order of some bins, each followed by its reverse."""
    half = [one for one in permutations(range(bins)) if one[0] < one[-1]]
    return np.array([order for one in half for order in (one, one[::-1])], dtype=np.intp)


def rungs(analysis: Analysis, hypothesis: str) -> Rungs:
    model = compile_model(analysis, hypothesis)
    assert model.observed is not None
    found = rungs_of(model, model.observed)
    assert found is not None
    return found


def drawn(analysis: Analysis, hypothesis: str, seed: int = 1, draws: int = 64) -> Bridge:
    return bridge(rungs(analysis, hypothesis), np.random.SeedSequence(seed), draws)


def test_shares_of_known_expectations_are_each_bins_own_ratio() -> None:
    """Nothing unknown: ln B is the sum of n ln(1 + s/b) - s, by hand, whatever the order."""
    background, signal, observed = [4.0, 6.5, 3.0], [1.0, 2.5, 0.0], [7.0, 5.0, 2.0]
    analysis = templates(
        several_bins("r", observed, {"background": background, "signal": signal}), Fixed(1.0)
    )
    (account,) = ledger(analysis, orders=5).accounts
    s, b, n = np.array(signal), np.array(background), np.array(observed)
    by_hand = n * np.log1p(s / b) - s
    assert account.established
    assert account.shares is not None
    assert account.shares.draws == 0
    assert [part.share for part in account.bins] == pytest.approx(by_hand.tolist(), abs=1e-12)
    assert [part.loss for part in account.bins] == pytest.approx(by_hand.tolist(), abs=1e-12)
    assert max(part.share_error or 0.0 for part in account.bins) < 1e-12
    assert {part.way for part in account.bins} == {"closed form"}


def test_shares_of_on_and_off_counts_are_those_of_the_closed_forms() -> None:
    """Two bins have two orders; the four evidences that they need have closed forms (gamma mixtures)."""
    on, off, prior, signal = 8, 14, (LEVEL.shape, LEVEL.rate), (1.0, 1.0 / YIELD)
    analysis = counting(on, LEVEL, Exponential(1.0), control=off)
    (account,) = ledger(analysis).accounts
    alone = ln_gamma_background(on, prior, signal) - float(ln_gamma_mixture(on, *prior))
    control = 0.0  # the control region alone says nothing of the signal
    both = ln_on_off_signal(on, off, TAU, prior, signal) - ln_on_off_background(on, off, TAU, prior)
    exact = [0.5 * (alone + both - control), 0.5 * (both - alone + control)]
    for part, share in zip(account.bins, exact, strict=True):
        assert part.share is not None
        assert part.sampling_error is not None
        assert abs(part.share - share) < 4.0 * part.sampling_error
        assert part.sampling_error < 0.02
    assert account.bins[0].without == pytest.approx(control, abs=1e-12)
    assert account.bins[1].without == pytest.approx(alone, abs=1e-10)


@pytest.mark.parametrize("name", enumerated.NAMES)
def test_every_order_is_followed_as_quadrature_sums_it(name: str) -> None:
    """All 24 orders of four bins, each bin's part of each order, against sums that share no code."""
    orders = all_orders(enumerated.BINS)
    found = chain(drawn(enumerated.analysis(), name, draws=256), orders)
    exact = np.array([enumerated.added(name, tuple(map(int, order))) for order in orders])
    pairs = exact.reshape(-1, 2, enumerated.BINS).mean(axis=1)
    errors = sampling_errors(found.shaken)
    assert errors.max() < 0.01
    assert np.abs(found.added - exact.mean(axis=0)).max() < 4.0 * errors.max()
    assert np.abs(found.pairs - pairs).max() < 0.05


def test_shares_agree_with_the_average_over_every_order() -> None:
    (account,) = ledger(enumerated.analysis(), by=("bins",)).accounts
    for part, exact in zip(account.bins, enumerated.shares(), strict=True):
        assert part.share is not None
        assert part.share_error is not None
        assert abs(part.share - exact) < 4.0 * part.share_error
        assert part.share_error < 0.1


def pulls(analysis: Analysis, name: str, exact: Array, seeds: int, corrupt: float = 0.0) -> Array:
    """Return (seed, bin) pulls of what each bin adds; `corrupt` is added to every proposal's ln density."""
    orders, made = all_orders(enumerated.BINS), rungs(analysis, name)
    if corrupt:
        wrong = tuple(Wrong(one, corrupt) for one in made.proposals)
        made = replace(made, proposals=wrong)  # type: ignore[arg-type]
    found = [chain(bridge(made, np.random.SeedSequence(seed), 16), orders) for seed in range(seeds)]
    return np.array([(one.added - exact) / sampling_errors(one.shaken) for one in found])


def test_sampling_errors_are_of_the_right_size() -> None:
    """Pulls over 60 seeds: no shift; their mean square as for t with 15 degrees of freedom, 15/13."""
    orders = all_orders(enumerated.BINS)
    exact = np.mean([enumerated.added(SIGNAL, tuple(map(int, order))) for order in orders], axis=0)
    found = pulls(enumerated.analysis(), SIGNAL, exact, 60)
    assert 0.5 < np.mean(found**2) < 1.8
    assert np.abs(found.mean(axis=0)).max() < 4.0 * 1.2 / np.sqrt(60.0)
    assert np.abs(found).max() < 6.0


def test_proposals_with_a_wrong_density_are_seen() -> None:
    """The negative control: densities too high by 0.3 shift what the bins add beyond its error."""
    orders = all_orders(enumerated.BINS)
    exact = np.mean([enumerated.added(SIGNAL, tuple(map(int, order))) for order in orders], axis=0)
    found = pulls(enumerated.analysis(), SIGNAL, exact, 60, corrupt=0.3)
    assert np.abs(found.mean(axis=0)).max() > 8.0 * 1.2 / np.sqrt(60.0)


def test_order_errors_are_of_the_right_size() -> None:
    """The same draws, 60 sets of 32 random orders and their reverses, against every order."""
    whole = drawn(enumerated.analysis(), SIGNAL, draws=64)
    exact = chain(whole, all_orders(enumerated.BINS)).added
    found = []
    for seed in range(60):
        some = chain(whole, random_orders(enumerated.BINS, 32, np.random.SeedSequence(seed)))
        error = some.pairs.std(axis=0, ddof=1) / np.sqrt(len(some.pairs))
        found.append((some.added - exact) / error)
    assert 0.7 < np.mean(np.square(found)) < 1.5  # t with 31 degrees of freedom: 31/29
    assert np.abs(np.mean(found, axis=0)).max() < 4.0 * 1.3 / np.sqrt(60.0)


def test_an_order_is_followed_by_its_reverse() -> None:
    orders = random_orders(7, 5, np.random.SeedSequence(3))
    assert orders.shape == (10, 7)
    assert (orders[1::2] == orders[::2, ::-1]).all()
    assert (np.sort(orders, axis=1) == np.arange(7)).all()
    assert len({tuple(order) for order in orders.tolist()}) == 10


def narrow() -> Analysis:
    """Return a bump of unknown mass on twenty bins."""
    edges = np.linspace(0.0, 20.0, 21)
    counts = np.round(400.0 * -np.diff(np.exp(-edges / 8.0)) / -np.expm1(-2.5))
    counts[7] += 14.0
    return bump(counts, bins=20)


def two_regions() -> Analysis:
    """Return on and off counts whose control region has template errors."""
    region = several_bins(
        "r",
        [12.0, 9.0, 4.0],
        {"background": [8.0, 9.0, 5.0], "signal": [4.0, 1.0, 0.0]},
        {"background": [1.0, 2.0, 1.5]},
        template_errors=True,
    )
    return templates(region)


@pytest.mark.parametrize("analysis", [narrow(), two_regions(), enumerated.analysis()])
def test_shares_add_up_to_the_bayes_factor_exactly(analysis: Analysis) -> None:
    (account,) = ledger(analysis, by=("bins", "regions"), orders=8).accounts
    assert account.shares is not None
    assert account.shares.total is not None
    assert account.shares.total_error is not None
    total = sum(part.share or 0.0 for part in account.bins)
    assert total == pytest.approx(account.shares.total, abs=1e-12)
    assert sum(part.share or 0.0 for part in account.regions) == pytest.approx(total, abs=1e-12)
    value, error = account.comparison.ln_bayes_factor, account.comparison.ln_bayes_factor_error
    assert total == pytest.approx(value, abs=1e-9)
    if account.shares.drawn is not None:
        drawn = account.shares.drawn
        assert drawn.value != value
        assert abs(drawn.value - total) < 4.0 * float(np.hypot(error or 0.0, drawn.error))
        assert account.shares.rest[0].error == pytest.approx(error, rel=1e-9)


def test_a_regions_share_is_the_sum_of_its_bins() -> None:
    analysis = counting(8, LEVEL, Exponential(1.0), control=14)
    (account,) = ledger(analysis, orders=4).accounts
    for region in account.regions:
        inside = [part.share or 0.0 for part in account.bins if part.region == region.region]
        assert region.share == pytest.approx(sum(inside), abs=1e-12)


def test_the_powers_reach_from_the_whole_to_less_than_one_bin() -> None:
    for bins in (1, 2, 60, 5000):
        powers = powers_for(bins)
        assert powers[0] == 1.0
        assert powers[-1] * bins <= 1.0
        assert all(after < before for before, after in pairwise(powers))


def test_the_same_seed_gives_the_same_ledger() -> None:
    first, second = (ledger(enumerated.analysis(), orders=4, seed=5) for _ in range(2))
    other = ledger(enumerated.analysis(), orders=4, seed=6)
    assert first == second
    assert first != other


def thin(found: Chain, effective: float) -> Chain:
    return replace(found, effective=np.full_like(found.effective, effective))


def test_shares_that_rest_on_too_few_draws_are_not_established() -> None:
    analysis = enumerated.analysis()
    (account,) = ledger(analysis, by=("bins",), orders=2).accounts
    orders = random_orders(enumerated.BINS, 4, np.random.SeedSequence(1))
    one, zero = (chain(drawn(analysis, name), orders) for name in (SIGNAL, "background only"))
    good = split(account.comparison, one, zero)
    assert good is not None
    assert good.how.established
    few = split(account.comparison, thin(one, 3.0), zero)
    assert few is not None
    assert few.how.total is None
    assert "3 effective draws or fewer" in few.how.reason
    other = replace(account.comparison, ln_bayes_factor=(account.comparison.ln_bayes_factor or 0.0) + 1.0)
    apart = split(other, one, zero)
    assert apart is not None
    assert "they differ by more than" in apart.how.reason
