"""Other readings of variations that lie on the same side."""

from __future__ import annotations

import re
from dataclasses import replace
from pathlib import Path

import pytest

from workbench.evidence.weigh import weigh
from workbench.hypotheses.analysis import Analysis
from workbench.hypotheses.file.reading import read_analysis

SKERRY = Path(__file__).parents[2] / "data" / "skerry" / "skerry-fixed-mass.toml"


def with_fake_rate(up: float, down: float | None) -> Analysis:
    """Return Skerry at fixed mass with another effect of the fake rate."""
    analysis = read_analysis(SKERRY)
    changed = []
    for source in analysis.uncertainties:
        if source.name == "fake rate":
            effects = tuple(replace(effect, up=up, down=down) for effect in source.effects)
            changed.append(replace(source, effects=effects))
        else:
            changed.append(source)
    return replace(analysis, uncertainties=tuple(changed))


def ln_bayes_factor(analysis: Analysis) -> float:
    value = weigh(analysis).comparisons[0].ln_bayes_factor
    assert value is not None
    return value


def test_variations_on_one_side_are_weighed_under_their_other_readings() -> None:
    """N13: the reading is asked for, and each alternative's ln B is that of an analysis that says it."""
    as_given = with_fake_rate(0.3, 0.1)
    said = [one.text for one in weigh(as_given).cautions if one.code == "one-sided-reading"]
    assert len(said) == 1
    changes = [float(found.replace("−", "-")) for found in re.findall(r"changes by ([+−]\d+\.\d\d)", said[0])]
    given = ln_bayes_factor(as_given)
    assert changes[0] == pytest.approx(ln_bayes_factor(with_fake_rate(0.3, None)) - given, abs=0.1)
    assert changes[1] == pytest.approx(ln_bayes_factor(with_fake_rate(0.1, None)) - given, abs=0.1)
    assert "the larger size (30 %)" in said[0]
    assert "half of their distance (10 %)" in said[0]


def test_two_sided_variations_need_no_other_reading() -> None:
    assert not [one for one in weigh(with_fake_rate(0.3, -0.2)).cautions if one.code == "one-sided-reading"]
