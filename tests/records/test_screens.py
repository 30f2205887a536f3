"""Whole screens, compared as text with tests/expected/."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from tests.records import hand_built as hand
from tests.records import hand_built_priors as hand_priors
from tests.records import hand_scans as scans
from workbench.evidence.results import Evidence
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.hypothesis import Hypothesis
from workbench.likelihood.results import Ending, Fitted
from workbench.records.outcomes import FitOutcome, WeighOutcome
from workbench.records.screens.check import check_screen
from workbench.records.screens.fit import fit_screen, value_text
from workbench.records.screens.layout import WIDEST, columns, plain_ascii, wide_columns
from workbench.records.screens.priors import priors_screen
from workbench.records.screens.reading import reading_screen
from workbench.records.screens.scan import scan_screen
from workbench.records.screens.weigh import weigh_screen

EXPECTED = Path(__file__).parents[1] / "expected"

SCREENS: dict[str, Callable[[], str]] = {
    "weigh": lambda: weigh_screen(hand.weighed()),
    "weigh-background-fails": lambda: weigh_screen(hand.weighed(judged=hand.adequacies(0.003))),
    "weigh-neither-fits": lambda: weigh_screen(hand.weighed(judged=hand.adequacies(0.0005, 0.0005))),
    "weigh-not-established": lambda: weigh_screen(hand.weighed(hand.unestablished())),
    "weigh-annealed": lambda: weigh_screen(hand.weighed(hand.annealed())),
    "weigh-huge": lambda: weigh_screen(hand.weighed(hand.weighing(2000.0))),
    "weigh-three": lambda: weigh_screen(three()),
    "weigh-ascii": lambda: plain_ascii(weigh_screen(hand.weighed())),
    "check": lambda: check_screen(hand.checked()),
    "check-planning": lambda: check_screen(replace(hand.checked(()), analysis=planned())),
    "scan": lambda: scan_screen(scans.outcome()),
    "scan-ascii": lambda: plain_ascii(scan_screen(scans.outcome(scans.over_mass()))),
    "scan-over-mass": lambda: scan_screen(scans.outcome(scans.over_mass())),
    "scan-over-strength": lambda: scan_screen(scans.outcome(scans.over_strength())),
    "scan-not-established": lambda: scan_screen(scans.outcome(scans.unestablished())),
    "scan-nowhere": lambda: scan_screen(scans.outcome(scans.nowhere())),
    "reprior": lambda: reading_screen(scans.reading()),
    "reprior-averaged": lambda: reading_screen(scans.reading(scans.over_mass(), {})),
    "reprior-not-established": lambda: reading_screen(scans.reading(scans.unestablished())),
    "fit": lambda: fit_screen(hand.fitted()),
    "priors": lambda: priors_screen(hand_priors.examined()),
    "priors-against": lambda: priors_screen(hand_priors.examined(hand_priors.examination(4.0))),
    "priors-not-established": lambda: priors_screen(hand_priors.examined(hand_priors.unestablished())),
    "priors-ascii": lambda: plain_ascii(priors_screen(hand_priors.examined())),
    "priors-neither-fits": lambda: priors_screen(hand_priors.examined(fails=True)),
    "fit-not-converged": lambda: fit_screen(unfinished()),
}


def three() -> WeighOutcome:
    """Return an outcome with a third hypothesis, whose evidence has no estimate at all."""
    given = hand.weighed()
    third = "a broad resonance with a long name that nobody wants to abbreviate"
    weighing = given.weighing
    reason = "no parameter value can produce the 4 counts in bin 11 of region peak"
    comparison = replace(
        weighing.comparisons[0],
        hypothesis=third,
        ln_bayes_factor=None,
        ln_bayes_factor_error=None,
        posterior_odds=None,
        posterior_odds_error=None,
        established=False,
        sensitivity=(),
    )
    posteriors = [*weighing.posteriors, replace(weighing.posteriors[1], hypothesis=third)]
    analysis = replace(
        given.analysis,
        hypotheses=(
            *given.analysis.hypotheses,
            Hypothesis(third, ("continuum", "resonance"), 1.0, {"mass": 45.0}),
        ),
    )
    return replace(
        given,
        analysis=analysis,
        weighing=replace(
            weighing,
            evidences=(*weighing.evidences, Evidence(third, None, None, False, reason, ())),
            posteriors=tuple(replace(item, probability=None, error=None) for item in posteriors),
            comparisons=(*weighing.comparisons, comparison),
        ),
        adequacies=(
            *given.adequacies,
            replace(given.adequacies[1], hypothesis=third, p=0.0012, p_error=0.0008),
        ),
        fits=(*given.fits, replace(given.fits[1], hypothesis=third, ending=Ending.NO_SUPPORT)),
    )


def planned() -> Analysis:
    """Return the analysis before anything was observed."""
    analysis = hand.analysis()
    region = analysis.regions[0]
    table = replace(region.table, observed=None)
    return replace(analysis, regions=(replace(region, table=table),))


def unfinished() -> FitOutcome:
    """Return fits of which the second did not converge and has a parameter at its limit."""
    given = hand.fitted()
    second = given.fits[1]
    strength = replace(second.fitted[0], value=0.0, error=None, low=None, high=None, at_limit=True)
    fitted = (strength, *(replace(item, low=None, high=None) for item in second.fitted[1:]))
    changed = replace(second, ending=Ending.NOT_CONVERGED, fitted=fitted, correlations=np.eye(7))
    return replace(given, fits=(given.fits[0], changed))


@pytest.mark.parametrize("name", SCREENS)
def test_a_screen_is_the_one_kept(name: str) -> None:
    assert SCREENS[name]() == (EXPECTED / f"{name}.txt").read_text(encoding="utf-8")


def test_every_kept_screen_is_compared_here() -> None:
    assert {path.stem for path in EXPECTED.glob("*.txt")} >= set(SCREENS)


@pytest.mark.parametrize("name", SCREENS)
def test_a_screen_fits_a_terminal(name: str) -> None:
    assert max(len(line) for line in SCREENS[name]().splitlines()) <= WIDEST


def test_when_nothing_fits_that_is_said_before_anything_else() -> None:
    lines = SCREENS["weigh-neither-fits"]().splitlines()
    assert lines[1].strip() == "NEITHER HYPOTHESIS DESCRIBES THE DATA"


def test_adequacy_is_said_before_the_odds() -> None:
    text = SCREENS["weigh"]()
    assert text.index("Do the hypotheses describe the data?") < text.index("posterior odds")


def test_what_is_not_established_shows_no_odds() -> None:
    text = SCREENS["weigh-not-established"]()
    assert "NOT ESTABLISHED" in text
    assert "posterior odds" not in text
    assert "ln B" not in text


def test_a_reason_that_both_hypotheses_share_is_said_once_in_the_frame_and_once_below_the_evidences() -> None:
    given = hand.unestablished()
    reason = given.evidences[1].reason
    first = replace(given.evidences[0], established=False, reason=reason)
    text = weigh_screen(hand.weighed(replace(given, evidences=(first, given.evidences[1]))))
    said = " ".join(text.split())
    assert said.count(reason) == 2
    assert f'"background only" and "resonance" are not established: {reason}.' in said
    assert f'"background only" and "resonance": {reason}.' in said


def test_a_fit_that_nothing_supports_shows_no_likelihood() -> None:
    """It said "ln likelihood no number"."""
    given = hand.fitted()
    impossible = replace(given.fits[0], ending=Ending.NO_SUPPORT, ln_likelihood=-np.inf, fitted=())
    text = fit_screen(replace(given, fits=(impossible,)))
    assert "  No parameter value can produce the observed counts.\n" in text


def test_a_fit_names_what_the_data_say_little_about_under_its_table() -> None:
    lines = fit_screen(hand.fitted()).splitlines()
    note = lines.index("  · The data say nothing about fake composition: its error is that of its prior.")
    assert lines[note - 1].split()[0] == "exposure"


def test_sources_are_written_alike_whether_their_error_is_just_above_1_or_just_below() -> None:
    """One stood as "0.1 ± 1.0" above another's "0.12 ± 1.00"."""
    source = Fitted("a", "", "source", 0.1234, 1.004, None, None, 0.12, 0.0, False)
    assert value_text(source) == "0.12 ± 1.00"
    assert value_text(replace(source, error=0.996)) == "0.12 ± 1.00"
    assert value_text(replace(source, error=0.0123)) == "0.123 ± 0.012"


def test_a_fit_explains_its_columns_once() -> None:
    text = fit_screen(hand.fitted())
    assert text.count("contraction: 1 − (error / the prior's standard deviation)^2") == 1


def test_the_check_gives_no_odds() -> None:
    assert "odds" not in SCREENS["check"]()


def test_ascii_has_nothing_else() -> None:
    assert SCREENS["weigh-ascii"]().isascii()
    assert plain_ascii("Übergang µ") == "\\xdcbergang \\xb5"


def test_a_long_first_cell_stands_on_its_own_line() -> None:
    long = "a name of many words " * 4
    lines = columns([["name", "value"], [long.strip(), "1" * 20]], "lr")
    assert lines[1].strip() == long.strip()
    assert lines[2].strip() == "1" * 20
    assert max(map(len, lines)) <= WIDEST


def test_a_table_too_wide_is_broken_into_several() -> None:
    header = ["process", *(f"hypothesis number {number}" for number in range(8))]
    lines = wide_columns(header, [["continuum", *["1.0"] * 8]])
    assert max(map(len, lines)) <= WIDEST
    assert sum(line.strip().startswith("continuum") for line in lines) == 2
