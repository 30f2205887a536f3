"""The screen of `backgrounds`: what each alternative says, and the signal that it would fake."""

from __future__ import annotations

from collections.abc import Sequence

from workbench.evidence.backgrounds import AVERAGE, Backgrounds, Fake
from workbench.evidence.results import AlternativeEvidence
from workbench.evidence.spurious import FakedStrength
from workbench.records.numbers import fixed, probability, with_two_digits
from workbench.records.outcomes import BackgroundsOutcome
from workbench.records.screens.alternatives import factor_texts, ln_texts, posterior_words
from workbench.records.screens.counted import NONE, counted_lines, title_lines
from workbench.records.screens.layout import (
    INDENT,
    aligned_at,
    bullet,
    columns,
    heading,
    named,
    one_line,
    paragraph,
    screen,
)


def backgrounds_screen(outcome: BackgroundsOutcome) -> str:
    """Return what `backgrounds` found as text.

    Args:
        outcome: what was found.
    """
    found = outcome.found
    lines = title_lines(outcome.analysis, outcome.origin)
    for note in outcome.origin.notes:
        lines += paragraph(note)
    lines += counted_lines(outcome.analysis)
    lines += summary_lines(found)
    lines += fake_lines(found)
    if outcome.cautions:
        lines += heading("Warnings")
        for caution in outcome.cautions:
            lines += bullet(caution.text)
    return screen(lines)


def summary_lines(found: Backgrounds) -> list[str]:
    """Return one line an alternative: evidences, probabilities, ln B alone and the largest fake."""
    title = f"Backgrounds in doubt: {one_line(found.hypothesis)} against {one_line(found.against)}"
    lines = heading(title)
    if found.weighing is None:
        rows = [["alternative", "prior", "largest fake"]]
        for name, prior in zip(found.names, found.priors, strict=True):
            rows.append([one_line(name), probability(prior, 1.0 - prior), _largest(found, name)])
        return lines + columns(rows, "lrl") + paragraph("Nothing was observed yet, so nothing is weighed.")
    pair = [{one.name: one for one in evidence.alternatives} for evidence in found.weighing.evidences]
    rows = [["alternative", "prior", *(f"ln evidence, {which}" for which in ("background", "signal"))]]
    texts = [_evidence_texts([side.get(name) for name in found.names]) for side in pair]
    for place, name in enumerate(found.names):
        prior = found.priors[place]
        rows.append([one_line(name), probability(prior, 1.0 - prior), *(side[place] for side in texts)])
    lines += columns(rows, "lrll")
    (comparison,) = found.weighing.comparisons
    cells = factor_texts((*comparison.alternatives, comparison))
    rows = [["alternative", "posterior, background", "signal", "ln B if it holds", "largest fake"]]
    for place, name in enumerate(found.names):
        chances = [posterior_words(side.get(name)) for side in pair]
        rows.append([one_line(name), *chances, cells[place], _largest(found, name)])
    rows.append([AVERAGE, "", "", cells[-1], ""])
    lines += ["", *columns(rows, "lllll")]
    legend = (
        f"background: under {named(found.against)}; signal: under {named(found.hypothesis)}; largest fake: "
        "the strength, in its errors, that another alternative's expected counts would fake."
    )
    lines += ["", *paragraph(legend)]
    for evidence in found.weighing.evidences:
        if not evidence.established:
            lines += bullet(f"{named(evidence.hypothesis)} is not established: {evidence.reason}.")
    return lines


def fake_lines(found: Backgrounds) -> list[str]:
    """Return the fit and ln B of every alternative's expected counts under every alternative."""
    where = "at its fit to the observed counts" if found.is_fitted else "at the medians of its priors"
    lines = heading("The signal that each would fake")
    lines += paragraph(
        f"The expected counts of {named(found.against)}, {where}, taken for data: nothing here was observed. "
        "Faked is how much larger ln B is than with the alternative that holds."
    )
    cells = factor_texts(found.fakes)
    rows = [["fitted with", "strength", "in errors", "events", "ln B", "faked"]]
    last = ""
    for fake, cell in zip(found.fakes, cells, strict=True):
        if fake.truth != last:
            rows.append([f"if {one_line(fake.truth)} holds", "", "", "", "", ""])
        last = fake.truth
        faked = found.ln_faked(fake)
        change = NONE if faked is None or fake.truth == fake.fitted else _signed(faked[0])
        for place, strength in enumerate(fake.strengths or (None,)):
            ends = [cell, change] if place == 0 else ["", ""]
            label = INDENT + one_line(fake.fitted) if place == 0 else ""
            rows.append([label, *_strength_texts(strength), *ends])
    for column in (1, 3):
        texts = aligned_at(" ±", [row[column] for row in rows[1:]])
        for row, text in zip(rows[1:], texts, strict=True):
            row[column] = text
    table = [line for line in columns(rows, "llrllr") if line.strip()]  # below a long name nothing stands
    return [*lines, "", *table, *_places(found.fakes)]


def _strength_texts(one: FakedStrength | None) -> list[str]:
    if one is None:
        return [NONE, NONE, NONE]
    if one.error is None or one.events_error is None:
        return [f"{fixed(one.value, 3)}", NONE, fixed(one.events, 1)]
    return [
        with_two_digits(one.value, one.error),
        _signed(one.in_errors),
        with_two_digits(one.events, abs(one.events_error)),
    ]


def _places(fakes: Sequence[Fake]) -> list[str]:
    """Return where the fits put a signal whose place is free, one point a pair of alternatives."""
    lines: list[str] = []
    for fake in fakes:
        for strength in fake.strengths[:1]:
            if strength.at and fake.truth != fake.fitted:
                at = ", ".join(f"{one_line(name)} = {value:.4g}" for name, value in strength.at)
                lines += bullet(f"{named(fake.truth)} fitted with {named(fake.fitted)}: {at}.")
    return ["", *lines] if lines else []


def _largest(found: Backgrounds, name: str) -> str:
    largest = found.largest_fake(name)
    if largest is None:
        return NONE
    return f"{_signed(largest[1].in_errors)} of {one_line(largest[0])}"


def _evidence_texts(given: Sequence[AlternativeEvidence | None]) -> list[str]:
    known = [None if one is None or not one.evidence.established else one.evidence for one in given]
    return ln_texts([(None, None) if one is None else (one.ln_evidence, one.error) for one in known])


def _signed(value: float | None) -> str:
    if value is None:
        return NONE
    text = fixed(value, 2)
    return text if text.startswith("−") else f"+{text}"
