"""The ledger as a whole: what it accounts for, what it warns of, what it refuses."""

from __future__ import annotations

from dataclasses import replace

import pytest

from tests.evidence.ledger import enumerated
from tests.evidence.small_analyses import bump, counting, several_bins, templates
from workbench.errors import InputError
from workbench.evidence.ledger.ledger import ledger
from workbench.evidence.ledger.reading import decides, deciding_cautions, firmest_hold, heaviest
from workbench.evidence.ledger.results import Account, Hold, Part
from workbench.evidence.results import Comparison
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.hypothesis import Hypothesis
from workbench.hypotheses.priors import Exponential


def part(loss: float | None, place: int = 1) -> Part:
    without = None if loss is None else 2.0 - loss
    shares = (None, None, None)
    return Part("r", place, place - 1.0, place, 5, *shares, without, 0.01, loss, 0.01, "reweighted", 0.1)


def account(ln_bayes_factor: float, *losses: float | None, prior_odds: float = 1.0) -> Account:
    comparison = Comparison("one", "zero", ln_bayes_factor, 0.01, prior_odds, None, None, True)
    parts = tuple(part(loss, place) for place, loss in enumerate(losses, start=1))
    holds = (Hold("a", "source", 1.8, 0.01, 2.3, 0.01), Hold("b", "source", 2.1, 0.01, None, None))
    return Account(comparison, None, parts, (), holds)


def test_the_heaviest_part_and_the_firmest_hold_are_found_whatever_their_sign() -> None:
    one = account(2.0, 0.5, -0.9, None)
    found = heaviest(one.bins)
    assert found is not None
    assert found.place == 2
    hold = firmest_hold(one)
    assert hold is not None
    assert hold.name == "a"
    assert hold.reach(2.0) == pytest.approx(0.3)
    assert heaviest(()) is None


def test_one_bin_decides_when_the_odds_turn_or_most_of_the_weight_goes() -> None:
    assert decides(account(2.0, 1.1), part(1.1))  # more than half
    assert not decides(account(2.0, 0.9), part(0.9))
    assert decides(account(-2.0, -1.1), part(-1.1))
    assert not decides(account(2.0, -3.0), part(-3.0))  # without it, more of the same
    assert decides(account(4.0, 1.5, prior_odds=0.05), part(1.5))  # odds of 2.7 : 1 turn into 1 : 1.6
    assert not decides(account(0.5, 0.4), part(0.4))  # nothing to decide
    assert not decides(account(2.0, None), part(None))


def test_a_bin_that_decides_is_warned_of_by_its_range() -> None:
    (caution,) = deciding_cautions([account(2.0, 0.2, 1.5)])
    assert caution.code == "one-bin-decides"
    assert '1 to 2 in region "r"' in caution.text
    assert deciding_cautions([account(2.0, 0.2, 0.5)]) == ()
    assert deciding_cautions([account(2.0, 2.0)]) == ()  # the only bin there is decides everything


def test_a_real_excess_in_one_bin_is_warned_of() -> None:
    columns = {"background": [10.0, 10.0, 10.0], "signal": [3.0, 3.0, 3.0]}
    even = ledger(templates(several_bins("r", [13, 14, 13], columns)), by=("bins",), orders=4)
    spiked = ledger(templates(several_bins("r", [10, 30, 10], columns)), by=("bins",), orders=4)
    assert even.cautions == ()
    assert [one.code for one in spiked.cautions] == ["one-bin-decides"]


def three() -> Analysis:
    """Return an analysis of three hypotheses."""
    analysis = enumerated.analysis()
    zero, one = analysis.hypotheses
    held = Hypothesis("held", one.processes, 0.5, {"strength": 1.0})
    return replace(analysis, hypotheses=(zero, one, held))


def test_every_hypothesis_has_its_account_along_the_same_orders() -> None:
    whole = ledger(three(), by=("bins",), orders=4)
    assert [one.comparison.hypothesis for one in whole.accounts] == [enumerated.NAMES[1], "held"]
    (alone,) = ledger(three(), by=("bins",), orders=4, hypothesis="held").accounts
    assert alone == whole.accounts[1]


def test_only_what_is_asked_for_is_accounted_for() -> None:
    analysis = counting(8, 3.0, Exponential(1.0), control=12)
    (bins,) = ledger(analysis, by=("bins",), orders=2).accounts
    (regions,) = ledger(analysis, by=("regions",), orders=2).accounts
    assert len(bins.bins) == 2
    assert bins.regions == ()
    assert bins.uncertainties == ()
    assert [one.region for one in regions.regions] == ["on", "off"]
    assert regions.bins == ()
    assert [one.place for one in bins.bins] == [1, 1]
    assert [one.place for one in regions.regions] == [None, None]


def test_a_bayes_factor_that_is_not_established_has_no_account() -> None:
    """A count where nothing is expected."""
    region = several_bins("r", [5.0, 2.0], {"background": [4.0, 0.0], "signal": [2.0, 0.0]})
    found = ledger(templates(region), orders=2)
    (one,) = found.accounts
    assert not found.established
    assert one.bins == ()
    assert one.shares is not None
    assert one.shares.reason == "ln B itself is not established"


@pytest.mark.parametrize(
    ("options", "words"),
    [
        ({"by": ("bin",)}, "Nothing known to account for"),
        ({"orders": 1}, "Too few orders"),
        ({"hypothesis": "signal"}, "No such hypothesis"),
        ({"hypothesis": "background only"}, "The hypothesis that others are compared with"),
    ],
)
def test_what_can_not_be_accounted_for_is_refused(options: dict[str, object], words: str) -> None:
    with pytest.raises(InputError) as caught:
        ledger(enumerated.analysis(), **options)  # type: ignore[arg-type]
    assert [problem.what for problem in caught.value.problems] == [words]


def test_one_hypothesis_alone_has_no_ledger() -> None:
    analysis = enumerated.analysis()
    with pytest.raises(InputError, match="at least two hypotheses"):
        ledger(replace(analysis, hypotheses=analysis.hypotheses[:1]))


def test_an_analysis_without_counts_is_refused() -> None:
    with pytest.raises(InputError, match="observed counts"):
        ledger(bump())


def test_huge_counts_and_empty_bins_have_their_shares() -> None:
    """A billion events beside none: shares are numbers, and add up."""
    columns = {"background": [1e9, 0.5], "signal": [1e5, 2.0]}
    analysis = templates(several_bins("r", [1e9 + 8e4, 0.0], columns))
    (one,) = ledger(analysis, by=("bins",), orders=2).accounts
    assert one.established
    assert one.shares is not None
    assert sum(item.share or 0.0 for item in one.bins) == pytest.approx(one.shares.total, abs=1e-9)
