"""What the nuisance priors do, raised to powers: a table for a screen."""

from __future__ import annotations

from collections.abc import Sequence

from workbench.evidence.prior_choice.power_scaling import CONFLICT, THRESHOLD
from workbench.evidence.prior_choice.powers import PowerChange, PowerScaling, most_moving
from workbench.records.numbers import as_written, fixed
from workbench.records.screens.counted import NONE
from workbench.records.screens.layout import aligned_at, bullet, columns, heading, one_line

MOST = 16


def power_lines(scalings: Sequence[PowerScaling]) -> list[str]:
    """Return one line a nuisance prior: what its parameter rests on, and how ln B answers.

    Args:
        scalings: every nuisance prior to powers; none where there is no nuisance parameter.
    """
    if not scalings:
        return heading("There is no nuisance prior to examine")
    shown = most_moving(scalings, MOST)
    header = ["nuisance prior", "prior", "data", "tension", "ln B, wider", "ln B, narrower", "rests on"]
    halves = aligned_at(".", [_moved(one.changes[0]) for one in shown])
    doubles = aligned_at(".", [_moved(one.changes[1]) for one in shown])
    rows = [
        [
            one_line(one.parameter),
            fixed(one.by_prior, 3),
            fixed(one.by_data, 3),
            NONE if one.tension is None else _signed(one.tension, 1),
            half,
            double,
            one.driver.value,
        ]
        for one, half, double in zip(shown, halves, doubles, strict=True)
    ]
    lines = [*heading("Nuisance priors, each raised to a power"), *columns([header, *rows], "lrrrlll")]
    if len(shown) < len(scalings):
        more = len(scalings) - len(shown)
        lines += bullet(f"{more} more, which move ln B less and are not in conflict, are in the record.")
    limits = f"{as_written(THRESHOLD)}"
    lines += bullet(
        "Prior, data: how far the parameter's posterior moves for a doubling of the power of its "
        f"prior, or of the likelihood; from {limits} on it depends on that. Numerical errors "
        f"are at most {fixed(_largest(scalings), 3)}."
    )
    lines += bullet(
        "Tension: prior and data apart, in standard deviations; in conflict where the posterior depends on "
        f"both and they are {as_written(CONFLICT)} apart."
    )
    lines += bullet("Wider, narrower: the change of ln B with that prior to the power ½, and 2.")
    if any(change.is_fresh for one in scalings for change in one.changes):
        lines += bullet("† the reweighted draws were too uneven; both evidences were made again.")
    return lines


def _moved(change: PowerChange) -> str:
    mark = "†" if change.is_fresh else ""
    if change.ln_change is None or change.error is None:
        return NONE + mark
    if change.error == 0.0 and change.ln_change == 0.0:
        return "0.000"
    return f"{_signed(change.ln_change, 3)} ± {fixed(change.error, 3)}{mark}"


def _signed(value: float, decimals: int) -> str:
    text = fixed(value, decimals)
    return text if text.startswith("−") else f"+{text}"


def _largest(scalings: Sequence[PowerScaling]) -> float:
    return max(max(one.by_prior_error, one.by_data_error) for one in scalings)
