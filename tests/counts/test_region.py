"""A region's choices are checked together with its table."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from workbench.counts.binning import Binning
from workbench.counts.region import Region
from workbench.counts.table import Table
from workbench.errors import InputError

BINNING = Binning.from_edges([0, 1, 2])
DIPPING = Table(BINNING, None, {"fakes": np.array([1.0, -0.5])}, source="dip.csv", lines=(4, 7))


def test_template_bins_below_zero_are_refused_with_their_line() -> None:
    with pytest.raises(InputError, match=r'dip\.csv, line 7, column "fakes"'):
        Region("peak", DIPPING)


def test_template_bins_below_zero_are_zeroed_only_when_asked_and_then_reported() -> None:
    region = Region("peak", DIPPING, negative_templates="zero")
    assert region.table.columns["fakes"].tolist() == [1.0, 0.0]
    assert [caution.text for caution in region.cautions] == [
        'Template bins below zero were set to zero: dip.csv, line 7, column "fakes".'
    ]
    assert region.table.digest == DIPPING.digest
    assert DIPPING.columns["fakes"].tolist() == [1.0, -0.5]


def test_a_changed_copy_keeps_the_report_once() -> None:
    region = replace(Region("peak", DIPPING, negative_templates="zero"), unit="GeV")
    assert len(region.cautions) == 1


def test_a_region_without_negative_bins_has_nothing_to_report() -> None:
    region = Region("peak", Table(BINNING, None, {"fakes": np.ones(2)}), negative_templates="zero")
    assert region.cautions == ()


def test_all_wrong_choices_are_told_at_once() -> None:
    with pytest.raises(InputError) as caught:
        Region(" ", DIPPING, template_errors=True, negative_templates="zeros", empty_bin_events=0.0)
    assert [(problem.what, problem.remedy) for problem in caught.value.problems] == [
        ("A region without a name", "name the region"),
        ("An unknown way to treat template bins below zero", 'write "zero"'),
        ("Template errors asked for, but none given", "add the columns, or write template_errors = false"),
        (
            "Events for empty bins that are no positive number",
            "give a small number of events such as 0.1, or leave it out",
        ),
        (
            "Template bins below zero",
            (
                'merge bins, or write negative_templates = "zero" in the region of an analysis file, '
                "which is then reported"
            ),
        ),
    ]
