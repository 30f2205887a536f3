"""A region: one histogram's worth of bins with its choices."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np

from workbench.counts.magnitudes import WORKABLE, is_workable
from workbench.counts.table import Table, negative_template_problems
from workbench.errors import Caution, InputError, Problem, nearest, quoted

NEGATIVE_TEMPLATES = ("refuse", "zero")


@dataclass(frozen=True, slots=True, eq=False)
class Region:
    """One histogram's worth of bins.

    Attributes:
        name: the region's name.
        table: the histogram table; its template bins are >= 0 from here on.
        observable: what the axis measures.
        unit: the axis' unit.
        template_errors: True when the table's error columns enter the likelihood; None, left out, keeps them
            out as False does, which an analysis then warns of.
        negative_templates: "refuse", or "zero" to set negative template bins to zero, reported.
        empty_bin_events: expected events given to bins that no background can fill; None adds nothing.
        zeroed: where the template bins stood that were set to zero.

    Raises:
        InputError: with everything that is wrong with the choices, or with them and the table together.
    """

    name: str
    table: Table
    observable: str = ""
    unit: str = ""
    template_errors: bool | None = None
    negative_templates: str = "refuse"
    empty_bin_events: float | None = None
    zeroed: tuple[str, ...] = ()

    def __post_init__(self) -> None:
        problems = _choice_problems(self)
        negative = negative_template_problems(self.table.columns, self.table.places)
        if self.negative_templates != "zero":
            problems += negative
        if problems:
            raise InputError(*problems)
        if negative:
            columns = {name: np.maximum(values, 0.0) for name, values in self.table.columns.items()}
            object.__setattr__(self, "table", replace(self.table, columns=columns))
            object.__setattr__(self, "zeroed", self.zeroed + tuple(problem.where for problem in negative))

    @property
    def cautions(self) -> tuple[Caution, ...]:
        """Return what is worth knowing about the region: template bins that were set to zero."""
        return tuple(
            Caution("negative-template-zeroed", f"Template bins below zero were set to zero: {where}.")
            for where in self.zeroed
        )


def _choice_problems(region: Region) -> list[Problem]:
    where = f"region {quoted(region.name)}"
    problems = []
    if not region.name.strip():
        problems.append(Problem("A region without a name", where, "nothing", "a name", "name the region"))
    if region.negative_templates not in NEGATIVE_TEMPLATES:
        problems.append(
            Problem(
                "An unknown way to treat template bins below zero",
                f"{where}, negative_templates",
                quoted(str(region.negative_templates)),
                " or ".join(quoted(choice) for choice in NEGATIVE_TEMPLATES),
                nearest(str(region.negative_templates), NEGATIVE_TEMPLATES),
            )
        )
    if region.template_errors and not region.table.errors:
        problems.append(
            Problem(
                "Template errors asked for, but none given",
                f"{where}, template_errors",
                f"no error column in {region.table.source}",
                'at least one column "NAME error" beside the column "NAME"',
                "add the columns, or write template_errors = false",
            )
        )
    events = region.empty_bin_events
    if events is not None and not (math.isfinite(events) and events > 0):
        problems.append(
            Problem(
                "Events for empty bins that are no positive number",
                f"{where}, empty_bin_events",
                str(events),
                "a number > 0",
                "give a small number of events such as 0.1, or leave it out",
            )
        )
    elif events is not None and not is_workable(events):
        problems.append(
            Problem(
                "Events for empty bins too many or too few to be worked with",
                f"{where}, empty_bin_events",
                str(events),
                WORKABLE,
                "give a small number of events such as 0.1, or leave it out",
            )
        )
    return problems
